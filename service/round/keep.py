"""Stores what a document said, all of it in one short transaction, before anything computes on it."""

import datetime
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from sqlalchemy import Connection

from service.round.keys import sort_rows, unknown_counts
from service.round.kinds import require_same_kind
from service.round.plans import CalendarShape, RoundPlan, StreamPlan, shape_word
from service.round.ripen import keep_releases
from service.sources.document import Document, KeptOut
from storage.readings import Kept, NewReading, keep_readings, newest_readings
from storage.rounds import KeptOutRow, RoundCounts, note_counts
from storage.streams import SeenStream, list_streams, see_streams
from storage.validators import Validators, keep_validators


@dataclass(frozen=True, slots=True)
class KeptDocument:
    """What became of a document.

    `new_streams` are the ids of those met for the first time; `left_out` counts the rows of splits that the
    settings leave out.
    """

    counts: RoundCounts
    new_streams: tuple[str, ...]
    left_out: int


def keep(
    conn: Connection, plan: RoundPlan, document: Document, *, round_id: int, now: datetime.datetime
) -> KeptDocument:
    """Store a document's rows as readings, with the streams they belong to and what was kept out.

    Raises
    ------
    service.round.observe.UnusableReadings
        If a stream's counts were of another kind so far; the transaction must be taken back.
    """
    sorted_rows = sort_rows(document.rows, plan, now)
    for stream in (*planned_streams(conn, plan), *(stream for stream, _ in sorted_rows.by_stream)):
        require_same_kind(conn, stream)
    new = see_streams(conn, [_seen(stream) for stream, _ in sorted_rows.by_stream], now=now)
    named = {stream.id for stream, _ in sorted_rows.by_stream}
    # Of a stream that the document does not name, all that is known is absent now.
    unnamed = [(stream, ()) for stream in planned_streams(conn, plan) if stream.id not in named]
    kept_out = (*document.kept_out, *sorted_rows.kept_out)
    unknown = unknown_counts(kept_out, plan, now)
    kept = [
        _keep_stream(conn, stream, (*rows, *_new_unknown(conn, stream, rows, unknown)), round_id, now)
        for stream, rows in (*sorted_rows.by_stream, *unnamed)
    ]
    used = sum(len(rows) for _, rows in sorted_rows.by_stream)
    counts = _counts(kept, used, kept_out)
    note_counts(conn, round_id, counts)
    keep_validators(conn, plan.name, _validators(plan, document, counts), now=now)
    return KeptDocument(counts, new, sorted_rows.left_out)


def planned_streams(conn: Connection, plan: RoundPlan) -> tuple[StreamPlan, ...]:
    """The source's stored streams as the settings now describe them, without those they leave out."""
    planned = (plan.stream_for(stream.split) for stream in list_streams(conn, source=plan.name))
    return tuple({stream.id: stream for stream in planned if stream is not None}.values())


def _new_unknown(
    conn: Connection,
    stream: StreamPlan,
    rows: Sequence[NewReading],
    unknown: Mapping[str, Sequence[NewReading]],
) -> list[NewReading]:
    """The unknown counts of which nothing is known so far: what is known stays as it is."""
    if stream.id not in unknown:
        return []
    known = {row.key for row in rows} | {reading.key for reading in newest_readings(conn, stream.id)}
    return [one for one in unknown[stream.id] if one.key not in known]


def _keep_stream(
    conn: Connection,
    stream: StreamPlan,
    rows: Sequence[NewReading],
    round_id: int,
    now: datetime.datetime,
) -> Kept:
    if isinstance(stream.shape, CalendarShape):
        return keep_readings(conn, stream.id, rows, now=now, round_id=round_id)
    return keep_releases(conn, stream.id, stream.shape, rows, now=now, round_id=round_id)


def _counts(kept: Sequence[Kept], used: int, kept_out: Iterable[KeptOut]) -> RoundCounts:
    in_order = sorted(kept_out, key=lambda one: one.row)
    return RoundCounts(
        rows_used=used,
        stored=sum(one.stored for one in kept),
        unchanged=sum(one.unchanged for one in kept),
        absent=sum(one.absent for one in kept),
        held=sum(one.held for one in kept),
        kept_out=tuple(KeptOutRow(one.row, one.why, one.text) for one in in_order),
    )


def _seen(stream: StreamPlan) -> SeenStream:
    shape = shape_word(stream.shape)
    return SeenStream(stream.id, stream.source, stream.split, stream.title, stream.slate, shape)


def _validators(plan: RoundPlan, document: Document, counts: RoundCounts) -> Validators:
    if counts.held:
        # What was held back today must be met again tomorrow, even in an unchanged document.
        return Validators(None, None, plan.about)
    return Validators(document.validators.etag, document.validators.last_modified, plan.about)
