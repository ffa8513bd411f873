"""One round of one source: read its document, keep it, and bring its streams up to it."""

import datetime
import threading
from collections.abc import Iterable
from dataclasses import dataclass

from service.clock import Clock
from service.logs import log
from service.round.fold import Brought, Timing, bring_up
from service.round.keep import keep, keep_unchanged
from service.round.lateness import late_before
from service.round.plans import RoundPlan, StreamPlan
from service.sources.document import Document, Validators
from service.sources.errors import SourceUnreadable
from service.sources.open_source import Tools, read_document
from service.sources.plans import fingerprint
from storage.engine import Store
from storage.readings import newest_at
from storage.rounds import FAILED, GOOD, NOTHING_NEW, begin_round, end_round, list_rounds
from storage.shifts import Shift
from storage.streams import list_streams
from storage.validators import find_validators

ROUNDS_LOOKED_AT = 50


@dataclass(frozen=True, slots=True)
class RoundOutcome:
    """How a round went, in the words of the table of rounds."""

    round_id: int
    outcome: str
    message: str | None = None


def read_and_keep(store: Store, plan: RoundPlan, clock: Clock) -> RoundOutcome:
    """Read a source and keep what it said. Whatever goes wrong is recorded with the round, and no more."""
    with store.writing() as conn:
        round_id = begin_round(conn, plan.name, now=clock.now())
    try:
        outcome = _read_and_keep(store, plan, clock, round_id)
    except SourceUnreadable as error:
        outcome = RoundOutcome(round_id, FAILED, str(error))
    except Exception as error:  # A round must not end the daemon; the record says what happened.
        log.exception("round failed", source=plan.name, round=round_id)
        outcome = RoundOutcome(
            round_id, FAILED, f"Unexpected {type(error).__name__}; the log has the details."
        )
    with store.writing() as conn:
        end_round(conn, round_id, outcome.outcome, now=clock.now(), message=outcome.message)
    log.info(
        "round ended", source=plan.name, round=round_id, outcome=outcome.outcome, message=outcome.message
    )
    return outcome


def bring_up_source(
    store: Store, plan: RoundPlan, clock: Clock, stop: threading.Event
) -> tuple[tuple[str, Brought], ...]:
    """Fold the backlog of a source's streams, stopping between streams when asked to."""
    timing, streams = timing_of(store, plan, clock.now()), _streams(store, plan)
    brought = []
    for stream in streams:
        if stop.is_set():
            log.info("folding stopped", source=plan.name, done=len(brought), left=len(streams) - len(brought))
            break
        try:
            done = bring_up(store, stream, clock, timing)
        except Exception:  # One stream that cannot be folded must not keep the others from being told.
            log.exception("stream not folded", stream=stream.id)
            continue
        brought.append((stream.id, done))
        _log_shifts(done.shifts)
    return tuple(brought)


def _read_and_keep(store: Store, plan: RoundPlan, clock: Clock, round_id: int) -> RoundOutcome:
    with store.reading() as conn:
        known = find_validators(conn, plan.name, about=fingerprint(plan.source))
    validators = Validators(known.etag, known.last_modified, known.about) if known else Validators()
    document: Document = read_document(plan.source, validators, tools=Tools(clock.monotonic))
    now = clock.now()
    if document.not_modified:
        with store.writing() as conn:
            keep_unchanged(conn, _streams(store, plan), now=now)
        return RoundOutcome(round_id, NOTHING_NEW, "The source says that its document is unchanged.")
    with store.writing() as conn:
        kept = keep(conn, plan, document, round_id=round_id, now=now)
    return RoundOutcome(round_id, GOOD if kept.counts.stored else NOTHING_NEW)


def _streams(store: Store, plan: RoundPlan) -> tuple[StreamPlan, ...]:
    """The source's known streams, as the settings now describe them; those left out by now are not folded."""
    with store.reading() as conn:
        splits = [stream.split for stream in list_streams(conn, source=plan.name)]
    planned = (plan.stream_for(split) for split in splits)
    return tuple(stream for stream in planned if stream is not None)


def timing_of(store: Store, plan: RoundPlan, now: datetime.datetime) -> Timing:
    """How far the source's readings reach, and what would be told late."""
    with store.reading() as conn:
        reaches = newest_at(conn, plan.name)
        rounds = list_rounds(conn, source=plan.name, limit=ROUNDS_LOOKED_AT)
    return Timing(reaches, late_before(rounds, plan.every, now))


def _log_shifts(shifts: Iterable[Shift]) -> None:
    for shift in shifts:
        log.info(
            "shift recorded", stream=shift.stream_id, shift=shift.id, origin=shift.origin, late=shift.late
        )
