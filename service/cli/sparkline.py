"""A series of counts as one line of blocks. Pure."""

from collections.abc import Iterator, Sequence
from statistics import fmean

BLOCKS = "▁▂▃▄▅▆▇█"
PLAIN_BLOCKS = "_.:-=+*#"
MISSING = " "
_FULL_FROM = 0.95


def sparkline(counts: Sequence[int | None], width: int, blocks: str = BLOCKS) -> str:
    """The counts as blocks, neighbours averaged where there are more of them than the width.

    The lowest block stands for the smallest value and the highest for the 95 % quantile and all above it, so
    that one runaway hit does not flatten everything else. A missing count is a space.
    """
    values = list(_averaged(counts, max(width, 1)))
    there = sorted(value for value in values if value is not None)
    if not there:
        return MISSING * len(values)
    low, high = there[0], there[int(_FULL_FROM * (len(there) - 1))]
    return "".join(
        MISSING if value is None else blocks[_step(value, low, high, len(blocks))] for value in values
    )


def _averaged(counts: Sequence[int | None], width: int) -> Iterator[float | None]:
    places = min(width, len(counts))
    for place in range(places):
        part = counts[place * len(counts) // places : (place + 1) * len(counts) // places]
        there = [count for count in part if count is not None]
        yield fmean(there) if there else None


def _step(value: float, low: float, high: float, steps: int) -> int:
    if high <= low:
        return 0 if value <= low else steps - 1
    return min(int((value - low) / (high - low) * steps), steps - 1)
