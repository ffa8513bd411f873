"""Stores what a document said, all of it in one short transaction, before anything computes on it."""

import datetime
from collections.abc import Iterable
from dataclasses import dataclass

from sqlalchemy import Connection

from service.round.keys import Sorted, ready_utc, sort_rows
from service.round.plans import CalendarShape, ReleaseShape, RoundPlan, StreamPlan
from service.sources.document import Document, KeptOut, Validators
from storage.readings import keep_readings, newest_readings
from storage.ripe import note_ripe
from storage.rounds import KeptOutRow, RoundCounts, note_counts
from storage.streams import SeenStream, see_streams
from storage.validators import Validators as StoredValidators
from storage.validators import keep_validators


@dataclass(frozen=True, slots=True)
class KeptDocument:
    """What became of a document. `new_streams` are the ids of those met for the first time."""

    counts: RoundCounts
    new_streams: tuple[str, ...]


def keep(
    conn: Connection, plan: RoundPlan, document: Document, *, round_id: int, now: datetime.datetime
) -> KeptDocument:
    """Store a document's rows as readings, with the streams they belong to and what was kept out."""
    sorted_rows = sort_rows(document.rows, plan, now)
    new = see_streams(conn, [_seen(stream) for stream, _ in sorted_rows.by_stream], now=now)
    counts = _keep_rows(conn, sorted_rows, document.kept_out, round_id, now)
    note_counts(conn, round_id, counts)
    keep_validators(conn, plan.name, _stored(document.validators), now=now)
    return KeptDocument(counts, new)


def keep_unchanged(conn: Connection, streams: Iterable[StreamPlan], *, now: datetime.datetime) -> None:
    """A document that is still the one we have says again what it said: releases ripen by it too."""
    for stream in streams:
        if isinstance(stream.shape, ReleaseShape):
            counted = [one for one in newest_readings(conn, stream.id) if one.count is not None]
            note_ripe(conn, stream.id, [one.key for one in counted if now >= ready_utc(stream.shape, one.at)])


def _keep_rows(
    conn: Connection,
    sorted_rows: Sorted,
    unreadable: tuple[KeptOut, ...],
    round_id: int,
    now: datetime.datetime,
) -> RoundCounts:
    used = stored = unchanged = absent = held = 0
    for stream, rows in sorted_rows.by_stream:
        kept = keep_readings(conn, stream.id, rows, now=now, round_id=round_id)
        if not isinstance(stream.shape, CalendarShape):
            note_ripe(conn, stream.id, [row.key for row in rows if row.final and row.count is not None])
        used += len(rows)
        stored, unchanged = stored + kept.stored, unchanged + kept.unchanged
        absent, held = absent + kept.absent, held + kept.held
    kept_out = sorted((*unreadable, *sorted_rows.kept_out), key=lambda one: one.row)
    shown = tuple(KeptOutRow(one.row, one.why, one.text) for one in kept_out)
    return RoundCounts(used, stored, unchanged, absent, held=held, kept_out=shown)


def _seen(stream: StreamPlan) -> SeenStream:
    shape = "calendar" if isinstance(stream.shape, CalendarShape) else "release"
    return SeenStream(stream.id, stream.source, stream.split, stream.title, stream.slate, shape)


def _stored(validators: Validators) -> StoredValidators:
    return StoredValidators(validators.etag, validators.last_modified, validators.fingerprint or "")
