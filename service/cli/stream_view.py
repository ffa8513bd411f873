"""Streams as people and machines read them."""

from collections import Counter
from collections.abc import Sequence

from service.cli.figures import LEVEL_COLUMN, figures_json, probability_text, quantiles_text
from service.cli.show import Cell, say, show_table
from service.cli.standings import StreamStanding

COLUMNS = (
    "stream",
    "title",
    "stands",
    "newest",
    "count",
    LEVEL_COLUMN,
    "shift",
    "counts",
    "slate",
    "hushed until",
)
ONLY_IF_THERE = frozenset({"title", "hushed until"})
LEGEND = (
    "level: as filtered from the counts so far; shift: probability of a recent shift not announced yet; "
    "counts: how many were folded."
)
NOT_DESCRIBED = "no longer in the settings"


def show_streams(standings: Sequence[StreamStanding]) -> None:
    """A table; columns that tell nothing are left out of it."""
    lines = [_cells(one) for one in standings]
    there = [place for place, name in enumerate(COLUMNS) if _tells(name, [line[place] for line in lines])]
    show_table([COLUMNS[place] for place in there], [[line[place] for place in there] for line in lines])
    if standings:
        say("")
        say(summary(standings))
        say(LEGEND)


def summary(standings: Sequence[StreamStanding]) -> str:
    """How many streams stand how."""
    counted = Counter(_stands(one) for one in standings)
    ordered = sorted(counted.items(), key=lambda item: (-item[1], item[0]))
    streams = "1 stream" if len(standings) == 1 else f"{len(standings)} streams"
    return f"{streams}: {', '.join(f'{number} {word}' for word, number in ordered)}."


def stream_json(one: StreamStanding) -> dict[str, object]:
    """A stream with how it stands and what was last said of it."""
    stream, newest = one.stream, one.newest
    return {
        "id": stream.id,
        "title": stream.title,
        "source": stream.source,
        "split": stream.split,
        "slate": stream.slate,
        "shape": stream.shape,
        "stands": None if one.stands is None else str(one.stands),
        "in_settings": one.stands is not None,
        "first_read": stream.first_read_utc,
        "last_seen": stream.last_seen_utc,
        "hushed_until": stream.hushed_until_utc,
        "counts": 0 if newest is None else newest.counted,
        "newest": None if newest is None else figures_json(newest),
    }


def _tells(column: str, cells: Sequence[Cell]) -> bool:
    different = set(cells)
    if column == "slate":
        return len(different) > 1
    return column not in ONLY_IF_THERE or different not in (set(), {None})


def _cells(one: StreamStanding) -> list[Cell]:
    stream, newest = one.stream, one.newest
    title = None if stream.id == stream.title or stream.id.endswith(f"/{stream.title}") else stream.title
    figures: list[Cell] = [None, None, None, None, 0]
    if newest is not None:
        figures = [
            newest.key if stream.shape == "calendar" else newest.at,
            newest.count,
            quantiles_text(newest.level),
            probability_text(newest.recent_shift),
            newest.counted,
        ]
    return [stream.id, title, _stands(one), *figures, stream.slate, stream.hushed_until_utc]


def _stands(one: StreamStanding) -> str:
    return NOT_DESCRIBED if one.stands is None else str(one.stands)
