"""What the whole record says once all its counts are known, in the form in which it is printed. Pure."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from detectors.look_back import look_back
from detectors.look_back_results import LookBack, Shift
from detectors.model import Model
from detectors.posterior import Quantiles
from service.replay.errors import ReplayError
from service.replay.places import Placed

Triple = tuple[float, float, float]

QUICK_COUNTS = 1000
"""So many counts are looked back on without being asked: it takes no longer than folding them."""
MOST_COUNTS = 5000


class TooLongToLookBack(ReplayError):
    """A record has more counts than are looked back on at once."""

    def __init__(self, got: int) -> None:
        self.got = got
        super().__init__(
            f"Looking back takes all counts at once, at most {MOST_COUNTS}; got {got}. "
            "Leave out --look-back, or replay a part of the file."
        )


@dataclass(frozen=True, slots=True)
class ShiftLine:
    """One shift as all counts show it. Indices are those of the file's rows."""

    index: int
    probability: float
    region: tuple[int, ...]
    region_probability: float
    modes: tuple[int, ...]
    level_before: Triple
    level_after: Triple
    effect: Triple


@dataclass(frozen=True, slots=True)
class SegmentationLine:
    """The most probable set of all shifts together."""

    indices: tuple[int, ...]
    probability: float


@dataclass(frozen=True, slots=True)
class LookBackLines:
    """The whole look back. What is listed per row is None where the count is missing or the row kept out."""

    shift_probability: tuple[float | None, ...]
    shifts: tuple[ShiftLine, ...]
    number_of_shifts: tuple[float, ...]
    segmentation: SegmentationLine
    level: tuple[Triple | None, ...]
    one_off: tuple[float | None, ...]
    log_evidence: float


Looking = Callable[[Sequence[Placed], int, Model], LookBackLines | None]
"""How to look back on placed rows, of a file with so many rows."""


def not_looking(placed: Sequence[Placed], rows: int, model: Model) -> LookBackLines | None:  # noqa: ARG001
    """Not at all."""
    return None


def looking_if_quick(placed: Sequence[Placed], rows: int, model: Model) -> LookBackLines | None:
    """Unless there are so many counts that it would keep people waiting."""
    return looked_back(placed, rows, model) if len(placed) <= QUICK_COUNTS else None


def looked_back(placed: Sequence[Placed], rows: int, model: Model) -> LookBackLines:
    """Look back on the rows.

    Raises
    ------
    TooLongToLookBack
        If there are too many.
    """
    if len(placed) > MOST_COUNTS:
        raise TooLongToLookBack(len(placed))
    said = look_back(model, [one.observation for one in placed])
    return look_back_lines(said, [one.index for one in placed], rows)


def look_back_lines(said: LookBack, row_of: Sequence[int], rows: int) -> LookBackLines:
    """A look back with its places in the file; `row_of` has the row of each observation."""
    probability: list[float | None] = [None] * rows
    odd: list[float | None] = [None] * rows
    level: list[Triple | None] = [None] * rows
    for place, row in enumerate(row_of):
        probability[row] = said.shift_probability[place]
        odd[row] = said.one_off[place]
        level[row] = _triple_if_any(said.level[place])
    return LookBackLines(
        tuple(probability),
        tuple(_shift_line(one, row_of) for one in said.shifts),
        said.number,
        SegmentationLine(_rows(said.segmentation.starts, row_of), said.segmentation.probability),
        tuple(level),
        tuple(odd),
        said.log_evidence,
    )


def _shift_line(shift: Shift, row_of: Sequence[int]) -> ShiftLine:
    return ShiftLine(
        row_of[shift.index],
        shift.probability,
        _rows(shift.region.indices, row_of),
        shift.region.probability,
        tuple(row_of[index] for index in shift.region.modes),
        _triple(shift.level_before),
        _triple(shift.level_after),
        _triple(shift.effect),
    )


def _rows(indices: Sequence[int], row_of: Sequence[int]) -> tuple[int, ...]:
    return tuple(sorted(row_of[index] for index in indices))


def _triple(of: Quantiles) -> Triple:
    return (of.low, of.mid, of.high)


def _triple_if_any(of: Quantiles | None) -> Triple | None:
    return None if of is None else _triple(of)
