"""Which stream and which key a row belongs to. Pure."""

import datetime
from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass

from service.round.calendar import Axis, at_of, end_of, key_of, position_of
from service.round.plans import CalendarShape, ReleaseShape, RoundPlan, StreamPlan
from service.sources.document import KeptOut, Row
from service.sources.rows import keep_out_conflicts
from storage.readings import NewReading

CALENDAR_FINAL_AFTER = datetime.timedelta(days=7)
"""Past this, a calendar count that still changes is kept once a day at most, unless it falls."""


@dataclass(frozen=True, slots=True)
class Sorted:
    """The rows of a document by stream, and those that were kept out while sorting."""

    by_stream: tuple[tuple[StreamPlan, tuple[NewReading, ...]], ...]
    kept_out: tuple[KeptOut, ...]
    left_out: int


def sort_rows(rows: Iterable[Row], plan: RoundPlan, now: datetime.datetime) -> Sorted:
    """Sort a document's rows by stream and key; both rows of a key that comes twice are kept out."""
    planned = [(row, plan.stream_for(row.split)) for row in rows]
    mine = {row.number: stream for row, stream in planned if stream is not None}
    wanted = [row for row, stream in planned if stream is not None]
    placed = [row for row in wanted if _has_key(row, mine[row.number])]
    keyless = [_without_key(row) for row in wanted if not _has_key(row, mine[row.number])]
    sifted = keep_out_conflicts(placed, lambda row: (mine[row.number].id, key_of_row(row, mine[row.number])))
    by_stream: dict[str, list[NewReading]] = defaultdict(list)
    streams = {mine[row.number].id: mine[row.number] for row in wanted}
    for row in sifted.rows:
        stream = mine[row.number]
        by_stream[stream.id].append(_reading(row, stream, now))
    return Sorted(
        tuple((streams[name], tuple(by_stream[name])) for name in sorted(streams)),
        (*keyless, *sifted.kept_out),
        len(planned) - len(wanted),
    )


def key_of_row(row: Row, stream: StreamPlan) -> str:
    """The stable key of a row: the start of its interval, or the release's id."""
    if isinstance(stream.shape, CalendarShape):
        return key_of(stream.shape.axis, position_of(stream.shape.axis, row.at))
    return row.release if row.release is not None else row.at.isoformat()


def ready_utc(
    shape: CalendarShape | ReleaseShape, at: datetime.date | datetime.datetime
) -> datetime.datetime:
    """The instant from which a count can be complete: its interval over, or its release at its final age."""
    if isinstance(shape, CalendarShape):
        return end_of(shape.axis, position_of(shape.axis, at)) + shape.settling
    return came_out_utc(shape, at) + shape.final


def came_out_utc(shape: ReleaseShape, at: datetime.date | datetime.datetime) -> datetime.datetime:
    """The instant at which a release came out; a day stands for its first moment in the stream's zone."""
    if isinstance(at, datetime.datetime):
        return at.astimezone(datetime.UTC)
    return datetime.datetime(at.year, at.month, at.day, tzinfo=shape.zone).astimezone(datetime.UTC)


def axis_at(axis: Axis, at: datetime.date | datetime.datetime) -> datetime.date | datetime.datetime:
    """The start of the interval that a day or an instant falls into."""
    return at_of(axis, position_of(axis, at))


def _has_key(row: Row, stream: StreamPlan) -> bool:
    return isinstance(stream.shape, CalendarShape) or row.release != ""


def _without_key(row: Row) -> KeptOut:
    return KeptOut(row.number, "its release id is empty; needed is one id a release.", row.at.isoformat())


def _reading(row: Row, stream: StreamPlan, now: datetime.datetime) -> NewReading:
    calendar = isinstance(stream.shape, CalendarShape)
    at = axis_at(stream.shape.axis, row.at) if isinstance(stream.shape, CalendarShape) else row.at
    grace = CALENDAR_FINAL_AFTER if calendar else datetime.timedelta(0)
    return NewReading(
        key=key_of_row(row, stream),
        at=at,
        count=row.count,
        title=row.title,
        exposure=row.exposure,
        final=now >= ready_utc(stream.shape, row.at) + grace,
    )
