"""Which stream and which key a row belongs to. Pure."""

import datetime
from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass, replace

from service.round.calendar import at_of, end_of, key_of, position_of
from service.round.plans import CalendarShape, ReleaseShape, RoundPlan, StreamPlan
from service.sources.document import KeptOut, Row
from service.sources.rows import keep_out_conflicts
from storage.readings import NewReading

At = datetime.date | datetime.datetime

CALENDAR_FINAL_AFTER = datetime.timedelta(days=7)
"""Past this, a calendar count that still changes is kept once a day at most, unless it falls."""


@dataclass(frozen=True, slots=True)
class Sorted:
    """The rows of a document by stream, and those that were kept out while sorting.

    A stream of which all rows were kept out is there without any. `left_out` counts the rows of splits that
    the settings leave out.
    """

    by_stream: tuple[tuple[StreamPlan, tuple[NewReading, ...]], ...]
    kept_out: tuple[KeptOut, ...]
    left_out: int


def sort_rows(rows: Iterable[Row], plan: RoundPlan, now: datetime.datetime) -> Sorted:
    """Sort a document's rows by stream and key; both rows of a key that comes twice are kept out."""
    given = tuple(rows)
    planned = {split: plan.stream_for(split) for split in {row.split for row in given}}
    streams = {split: stream for split, stream in planned.items() if stream is not None}
    wanted = [row for row in given if row.split in streams]
    sifted = keep_out_conflicts(
        wanted, lambda row: (streams[row.split].id, key_of_row(row, streams[row.split]))
    )
    by_id: dict[str, list[NewReading]] = defaultdict(list)
    for row in sifted.rows:
        by_id[streams[row.split].id].append(_reading(row, streams[row.split], now))
    in_order = sorted({stream.id: stream for stream in streams.values()}.items())
    return Sorted(
        tuple((stream, tuple(by_id[name])) for name, stream in in_order),
        sifted.kept_out,
        len(given) - len(wanted),
    )


def unknown_counts(
    kept_out: Iterable[KeptOut], plan: RoundPlan, now: datetime.datetime
) -> dict[str, tuple[NewReading, ...]]:
    """By stream the counts that nobody knows, as their rows were kept out, where no row would mean zero."""
    found: dict[str, dict[str, NewReading]] = defaultdict(dict)
    for row in (one.place for one in kept_out if one.place is not None):
        stream = plan.stream_for(row.split)
        if stream is not None and isinstance(stream.shape, CalendarShape) and stream.shape.absent == "zero":
            unknown = _reading(replace(row, exposure=None, title=None), stream, now)
            found[stream.id][unknown.key] = unknown
    return {stream_id: tuple(by_key.values()) for stream_id, by_key in found.items()}


def key_of_row(row: Row, stream: StreamPlan) -> str:
    """The stable key of a row: the start of its interval, or the release's id (without one: its date)."""
    if isinstance(stream.shape, CalendarShape):
        return key_of(stream.shape.axis, position_of(stream.shape.axis, row.at))
    if row.release is not None:
        return row.release
    # In UTC, so that a source that writes the same instant with another offset names the same release.
    at = row.at.astimezone(datetime.UTC) if isinstance(row.at, datetime.datetime) else row.at
    return at.isoformat()


def ready_utc(shape: CalendarShape | ReleaseShape, at: At) -> datetime.datetime:
    """The instant from which a count can be complete: its interval over, or its release at its final age."""
    if isinstance(shape, CalendarShape):
        return end_of(shape.axis, position_of(shape.axis, at)) + shape.settling
    return came_out_utc(shape, at) + shape.final


def began_utc(shape: CalendarShape | ReleaseShape, at: At) -> datetime.datetime:
    """The first moment of a day in the stream's zone; an instant is itself."""
    if isinstance(at, datetime.datetime):
        return at.astimezone(datetime.UTC)
    zone = shape.axis.zone if isinstance(shape, CalendarShape) else shape.zone
    return datetime.datetime(at.year, at.month, at.day, tzinfo=zone).astimezone(datetime.UTC)


def came_out_utc(shape: ReleaseShape, at: At) -> datetime.datetime:
    """The instant at which a release came out; a day stands for its first moment in the stream's zone."""
    return began_utc(shape, at)


def _reading(row: Row, stream: StreamPlan, now: datetime.datetime) -> NewReading:
    shape = stream.shape
    calendar = isinstance(shape, CalendarShape)
    grace = CALENDAR_FINAL_AFTER if calendar else datetime.timedelta(0)
    return NewReading(
        key=key_of_row(row, stream),
        at=at_of(shape.axis, position_of(shape.axis, row.at)) if isinstance(shape, CalendarShape) else row.at,
        count=row.count,
        title=row.title,
        exposure=row.exposure,
        final=now >= ready_utc(shape, row.at) + grace,
    )
