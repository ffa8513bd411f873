"""Brings one stream up to its readings: look, observe, advance, record. Nothing computes in a transaction."""

import datetime
from dataclasses import dataclass

from sqlalchemy import Connection

from detectors.advance import Checkpoint, start
from detectors.errors import UnreadableCheckpoint
from service.clock import Clock
from service.round.advance import fold, resume
from service.round.kinds import require_same_kind
from service.round.lateness import Downtime
from service.round.observe import Observed, Stored, observe
from service.round.plans import ReleaseShape, StreamPlan
from service.round.record import Result, is_recorded, record
from service.round.ripen import repoint
from service.round.shifts import Circumstances, shifts_of
from storage.checkpoints import CheckpointMark, checkpoint_bytes, drop_checkpoints, list_checkpoints
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
    """What a fold must know of its source's rounds: how far it reaches, and when it was and was not read.

    `read_utc` is the start of the last round that reached the source.
    """

    source_reaches: datetime.date | datetime.datetime | None
    downtimes: tuple[Downtime, ...]
    read_utc: datetime.datetime


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
    folded_before: int
    checkpoints: int
    up_to_date: bool


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
    if found.up_to_date:
        return Brought(0, found.observed.waiting, ())
    taken_up = _take_up(store, plan, found)
    folded = fold(taken_up.begun, taken_up.checkpoint, found.observed.observations, plan.rule)
    circumstances = _circumstances(plan, found, taken_up.known_before, timing.downtimes, now)
    shifts = shifts_of(folded.announcements, found.observed, circumstances)
    result = Result(plan.id, found.head, plan.fingerprint, found.observed, folded, shifts)
    with store.writing() as conn:
        new = record(conn, result, now)
    return Brought(len(folded.posteriors), found.observed.waiting, new)


def _look(conn: Connection, plan: StreamPlan, now: datetime.datetime, timing: Timing) -> _Found | None:
    stream = find_stream(conn, plan.id)
    if stream is None:
        return None
    require_same_kind(conn, plan)
    ripe = ripe_readings(conn, plan.id) if isinstance(plan.shape, ReleaseShape) else ()
    stored = Stored(newest_readings(conn, plan.id), ripe)
    observed = observe(plan, stored, _whole_by(plan, now, timing), source_reaches=timing.source_reaches)
    marks = list_checkpoints(conn, plan.id, fingerprint=plan.fingerprint)
    good = next((mark for mark in marks if _rests_on(mark, observed)), None)
    return _Found(
        stream=stream,
        head=head(conn, plan.id),
        observed=observed,
        begun=0 if good is None else good.folded,
        body=None if good is None else checkpoint_bytes(conn, good.id),
        folded_before=_folded_before(conn, plan.id),
        checkpoints=len(marks),
        up_to_date=stream.fingerprint == plan.fingerprint and is_recorded(marks, observed),
    )


def _whole_by(plan: StreamPlan, now: datetime.datetime, timing: Timing) -> datetime.datetime:
    """The instant by which an interval must be over for its count to be whole.

    One that was open when its source was last read has only a part of its count, though it be over by now.
    Releases need no such bound: which of their readings count is noted when they are read.
    """
    return now if isinstance(plan.shape, ReleaseShape) else min(now, timing.read_utc)


def _rests_on(mark: CheckpointMark, observed: Observed) -> bool:
    return mark.folded < len(observed.digests) and observed.digests[mark.folded] == mark.digest


def _circumstances(
    plan: StreamPlan,
    found: _Found,
    known_before: int,
    stretches: tuple[Downtime, ...],
    now: datetime.datetime,
) -> Circumstances:
    return Circumstances(
        stream_id=plan.id,
        first_read_utc=found.stream.first_read_utc,
        known_before=known_before,
        downtimes=stretches,
        now=now,
        fingerprint=plan.fingerprint,
        reading_id=found.head.reading_id or None,
    )


def _folded_before(conn: Connection, stream_id: str) -> int:
    last = newest_posterior(conn, stream_id)
    return 0 if last is None else last.place + 1


@dataclass(frozen=True)
class _TakenUp:
    """Where a fold begins, and how many places had been folded under other settings or are rebuilt."""

    begun: int
    checkpoint: Checkpoint
    known_before: int


def _take_up(store: Store, plan: StreamPlan, found: _Found) -> _TakenUp:
    # Without checkpoints a stream is rebuilt: what was there to be seen before is no news then either.
    same = found.stream.fingerprint in (None, plan.fingerprint) and found.checkpoints > 0
    try:
        begun, checkpoint = resume(found.begun, found.body, plan.model)
    except UnreadableCheckpoint:
        # Checkpoints are derived: whatever is wrong with them, the readings are still there.
        with store.writing() as conn:
            drop_checkpoints(conn, plan.id)
        return _TakenUp(0, start(plan.model), found.folded_before)
    return _TakenUp(begun, checkpoint, 0 if same else found.folded_before)


def _follow_changed_age(store: Store, plan: StreamPlan) -> None:
    """After the final age was changed, take each release's count at the new age from its stored readings."""
    if not isinstance(plan.shape, ReleaseShape):
        return
    with store.reading() as conn:
        stream = find_stream(conn, plan.id)
    if stream is not None and stream.fingerprint not in (None, plan.fingerprint):
        with store.writing() as conn:
            repoint(conn, plan.id, plan.shape, seen_utc=stream.last_seen_utc)
