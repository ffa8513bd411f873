"""Brings one stream up to its readings: look, observe, advance, record. Nothing computes in a transaction."""

import datetime
from dataclasses import dataclass

from sqlalchemy import Connection

from detectors.advance import Checkpoint
from detectors.errors import UnreadableCheckpoint
from service.clock import Clock
from service.round.advance import fold, resume
from service.round.observe import Observed, Stored, observe
from service.round.plans import ReleaseShape, StreamPlan
from service.round.record import Result, record
from service.round.ripen import repoint
from service.round.shifts import Circumstances, shifts_of
from storage.checkpoints import checkpoint_bytes, drop_checkpoints, list_checkpoints
from storage.engine import Store
from storage.errors import HeadMoved
from storage.posteriors import newest_posterior
from storage.readings import Head, head, newest_readings
from storage.ripe import ripe_readings
from storage.shifts import Shift
from storage.streams import Stream, find_stream

MOST_TRIES = 8


@dataclass(frozen=True, slots=True)
class Timing:
    """What a fold must know of its source's rounds: how far it reaches, and what counts as late."""

    source_reaches: datetime.date | datetime.datetime | None
    late_before: datetime.datetime | None


@dataclass(frozen=True, slots=True)
class Brought:
    """What bringing a stream up did: observations folded now, those waiting, and shifts newly recorded."""

    folded: int
    waiting: int
    shifts: tuple[Shift, ...]


@dataclass(frozen=True)
class _Found:
    stream: Stream
    head: Head
    observed: Observed
    begun: int
    body: bytes | None
    known_before: int


def bring_up(store: Store, plan: StreamPlan, clock: Clock, timing: Timing) -> Brought:
    """Fold whatever the stream's readings hold beyond its newest good checkpoint.

    Raises
    ------
    storage.errors.HeadMoved
        If others kept changing the stream during every try.
    """
    for _ in range(MOST_TRIES - 1):
        try:
            return _try(store, plan, clock, timing)
        except HeadMoved:
            continue
    return _try(store, plan, clock, timing)


def _try(store: Store, plan: StreamPlan, clock: Clock, timing: Timing) -> Brought:
    now = clock.now()
    _follow_changed_age(store, plan)
    with store.reading() as conn:
        found = _look(conn, plan, now, timing)
    if found is None:
        return Brought(0, 0, ())
    observations = found.observed.observations
    if found.begun == len(observations) and found.stream.fingerprint == plan.fingerprint:
        return Brought(0, found.observed.waiting, ())
    begun, checkpoint = _resumed(store, plan, found)
    folded = fold(begun, checkpoint, observations, plan.rule)
    circumstances = Circumstances(
        stream_id=plan.id,
        first_read_utc=found.stream.first_read_utc,
        known_before=found.known_before,
        late_before=timing.late_before,
        now=now,
        fingerprint=plan.fingerprint,
        reading_id=found.head.reading_id or None,
    )
    shifts = shifts_of(folded.announcements, found.observed, circumstances)
    result = Result(plan.id, found.head, plan.fingerprint, found.observed, folded, shifts)
    with store.writing() as conn:
        new = record(conn, result, now)
    return Brought(len(observations) - begun, found.observed.waiting, new)


def _look(conn: Connection, plan: StreamPlan, now: datetime.datetime, timing: Timing) -> _Found | None:
    stream = find_stream(conn, plan.id)
    if stream is None:
        return None
    newest = newest_readings(conn, plan.id)
    ripe = ripe_readings(conn, plan.id) if isinstance(plan.shape, ReleaseShape) else ()
    observed = observe(plan, Stored(newest, ripe), now, source_reaches=timing.source_reaches)
    begun, body = 0, None
    for mark in list_checkpoints(conn, plan.id, fingerprint=plan.fingerprint):
        if mark.folded < len(observed.digests) and observed.digests[mark.folded] == mark.digest:
            begun, body = mark.folded, checkpoint_bytes(conn, mark.id)
            break
    return _Found(stream, head(conn, plan.id), observed, begun, body, _known_before(conn, stream, plan))


def _known_before(conn: Connection, stream: Stream, plan: StreamPlan) -> int:
    """How many places had been folded under other settings or another version of the model."""
    if stream.fingerprint in (None, plan.fingerprint):
        return 0
    last = newest_posterior(conn, plan.id)
    return 0 if last is None else last.place + 1


def _resumed(store: Store, plan: StreamPlan, found: _Found) -> tuple[int, Checkpoint]:
    try:
        return resume(found.begun, found.body, plan.model)
    except UnreadableCheckpoint:
        # Checkpoints are derived: whatever is wrong with them, the readings are still there.
        with store.writing() as conn:
            drop_checkpoints(conn, plan.id)
        return resume(0, None, plan.model)


def _follow_changed_age(store: Store, plan: StreamPlan) -> None:
    """After the final age was changed, take each release's count at the new age from its stored readings."""
    if not isinstance(plan.shape, ReleaseShape):
        return
    with store.reading() as conn:
        stream = find_stream(conn, plan.id)
    if stream is not None and stream.fingerprint not in (None, plan.fingerprint):
        with store.writing() as conn:
            repoint(conn, plan.id, plan.shape)
