"""Streams as people and machines read them."""

import datetime
import shlex
from collections import Counter
from collections.abc import Sequence

from service.cli.figures import LEVEL_COLUMN, figures_json, place_text, probability_text, quantiles_text
from service.cli.show import Cell, say, show_telling
from service.cli.standings import StreamStanding
from service.standing import Standing
from service.tell.dates import instant_words

COLUMNS = (
    "stream",
    "title",
    "stands",
    "newest",
    "count",
    LEVEL_COLUMN,
    "shift",
    "slate",
    "hushed until",
)
MAY_LACK = frozenset({"title", "slate", "hushed until"})
LEGEND = "level: as filtered from the counts so far; shift: probability of a recent shift not announced yet."
NOT_DESCRIBED = "no longer in the settings"


def show_streams(standings: Sequence[StreamStanding]) -> None:
    """A table, how many stand how, and which sources are overdue."""
    if not standings:
        say("There is no such stream, or none yet: the first round makes them.")
        return
    slates = {one.stream.slate for one in standings}
    lines = [_cells(one, None if len(slates) == 1 else one.stream.slate) for one in standings]
    show_telling(COLUMNS, lines, MAY_LACK)
    say("")
    say(summary(standings))
    for sentence in overdue(standings):
        say(sentence)
    say(LEGEND)


def overdue(standings: Sequence[StreamStanding]) -> list[str]:
    """Which sources are overdue, and what to look at."""
    late = {one.stream.source: one.last_good_utc for one in standings if one.stands is Standing.LATE}
    return [
        f'Source "{source}" {_last_reached(reached)}: see knickpoint rounds --source {shlex.quote(source)}'
        for source, reached in sorted(late.items())
    ]


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


def _cells(one: StreamStanding, slate: str | None) -> list[Cell]:
    stream, newest = one.stream, one.newest
    title = None if stream.id == stream.title or stream.id.endswith(f"/{stream.title}") else stream.title
    figures: list[Cell] = [None, None, None, None]
    if newest is not None:
        figures = [
            place_text(stream.shape, newest.key, newest.at),
            newest.count,
            quantiles_text(newest.level),
            probability_text(newest.recent_shift),
        ]
    return [stream.id, title, _stands(one), *figures, slate, stream.hushed_until_utc]


def _stands(one: StreamStanding) -> str:
    return NOT_DESCRIBED if one.stands is None else str(one.stands)


def _last_reached(reached: datetime.datetime | None) -> str:
    return "was never reached" if reached is None else f"was last reached at {instant_words(reached)}"
