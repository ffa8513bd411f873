"""From the tables to stories: the untold shifts, slate by slate. Reads only."""

import datetime
from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal

from sqlalchemy import Connection

from service.tell.story import At, Marker, ShiftStory
from service.tell.unit import unit_of
from storage.shifts import Shift, untold_shifts
from storage.streams import Stream, find_stream

MOST_AT_ONCE = 500


@dataclass(frozen=True, slots=True)
class Untold:
    """A shift that nobody has been told of, and its stream."""

    shift: Shift
    stream: Stream


def gather(conn: Connection) -> dict[str | None, tuple[Untold, ...]]:
    """Untold shifts by slate, the first announced first; at most `MOST_AT_ONCE` of them."""
    streams: dict[str, Stream | None] = {}
    by_slate: defaultdict[str | None, list[Untold]] = defaultdict(list)
    for shift in untold_shifts(conn, limit=MOST_AT_ONCE):
        if shift.stream_id not in streams:
            streams[shift.stream_id] = find_stream(conn, shift.stream_id)
        stream = streams[shift.stream_id]
        if stream is not None:
            by_slate[stream.slate].append(Untold(shift, stream))
    return {slate: tuple(untold) for slate, untold in by_slate.items()}


def story_of(untold: Untold) -> ShiftStory:
    """Everything that is known of a shift. What its figures lack is left out rather than guessed."""
    shift, stream = untold.shift, untold.stream
    figures = shift.figures
    start = Marker(shift.start_key, shift.start_at, _text(figures, "start_title"), shift.start_position)
    announced = Marker(
        shift.announced_key, shift.announced_at, _text(figures, "announced_title"), shift.announced_position
    )
    region = _region(shift)
    shape: Literal["calendar", "release"] = "release" if stream.shape == "release" else "calendar"
    return ShiftStory(
        shift_id=shift.id,
        stream_id=stream.id,
        title=stream.title,
        slate=stream.slate,
        shape=shape,
        unit="release" if shape == "release" else unit_of((start, announced, *region)),
        level_before=shift.level_before,
        level_after=shift.level_after,
        probability=shift.probability,
        start=start,
        region=region,
        announced=announced,
        announced_utc=shift.announced_utc,
        readable_utc=_instant(figures, "ready_utc"),
        counts_since=_whole(figures, "counts_since"),
        late=shift.late,
        settings=shift.fingerprint,
        reading_id=shift.reading_id,
    )


def _region(shift: Shift) -> tuple[Marker, ...]:
    listed = shift.figures.get("region")
    if not isinstance(listed, list) or len(listed) != len(shift.region):
        return ()
    markers = (_marker(one, position) for one, position in zip(listed, shift.region, strict=True))
    return tuple(marker for marker in markers if marker is not None)


def _marker(listed: object, position: int) -> Marker | None:
    if not isinstance(listed, Mapping):
        return None
    key, at = _text(listed, "key"), _at(_text(listed, "at"))
    if key is None or at is None:
        return None
    return Marker(key, at, _text(listed, "title"), position)


def _at(text: str | None) -> At | None:
    try:
        if text is None or len(text) == len("2026-03-02"):
            return None if text is None else datetime.date.fromisoformat(text)
        at = datetime.datetime.fromisoformat(text)
    except ValueError:
        return None
    return at if at.tzinfo is not None else None


def _instant(figures: Mapping[str, Any], name: str) -> datetime.datetime | None:
    at = _at(_text(figures, name))
    return at if isinstance(at, datetime.datetime) else None


def _text(figures: Mapping[str, Any], name: str) -> str | None:
    value = figures.get(name)
    return value if isinstance(value, str) else None


def _whole(figures: Mapping[str, Any], name: str) -> int | None:
    value = figures.get(name)
    return value if isinstance(value, int) and not isinstance(value, bool) else None
