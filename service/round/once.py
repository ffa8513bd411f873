"""One round of one source: read its document, keep it, and bring its streams up to it."""

import datetime
import threading
from collections.abc import Iterable
from dataclasses import dataclass
from operator import itemgetter

from sqlalchemy import Connection

from service.clock import Clock
from service.logs import log
from service.round.fold import Brought, Timing, bring_up
from service.round.keep import KeptDocument, keep, planned_streams
from service.round.keys import began_utc
from service.round.lateness import downtimes
from service.round.plans import CalendarShape, RoundPlan
from service.round.ripen import came_to_age
from service.sources.document import Document, Validators
from service.sources.errors import SourceUnreadable
from service.sources.open_source import Tools, read_document
from service.sources.plans import fingerprint
from storage.engine import Store
from storage.errors import StoreError
from storage.readings import newest_readings
from storage.rounds import FAILED, GOOD, NOTHING_NEW, begin_round, end_round, list_rounds
from storage.shifts import Shift
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
    except (SourceUnreadable, StoreError) as error:
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
    timing = timing_of(store, plan, clock.now())
    with store.reading() as conn:
        streams = planned_streams(conn, plan)
    brought: list[tuple[str, Brought]] = []
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
    validators = _usable_validators(store, plan, clock.now())
    document: Document = read_document(plan.source, validators, tools=Tools(clock.monotonic))
    if document.not_modified:
        return RoundOutcome(round_id, NOTHING_NEW, "The source says that its document is unchanged.")
    with store.writing() as conn:
        kept = keep(conn, plan, document, round_id=round_id, now=clock.now())
    return RoundOutcome(round_id, GOOD if kept.counts.stored else NOTHING_NEW, _left_out(kept))


def _usable_validators(store: Store, plan: RoundPlan, now: datetime.datetime) -> Validators:
    """Those of the last document, unless something can be learned even from an unchanged one."""
    with store.reading() as conn:
        known = find_validators(conn, plan.name, about=plan.about)
        if known is None or came_to_age(conn, planned_streams(conn, plan), now):
            return Validators()
    return Validators(known.etag, known.last_modified, fingerprint(plan.source))


def _left_out(kept: KeptDocument) -> str | None:
    if not kept.left_out:
        return None
    return f"Rows of streams that the settings leave out: {kept.left_out}."


def timing_of(store: Store, plan: RoundPlan, now: datetime.datetime) -> Timing:
    """How far the source's counts reach by now, and when it was not read though it should have been."""
    with store.reading() as conn:
        reaches = _reaches(conn, plan, now)
        rounds = list_rounds(conn, source=plan.name, limit=ROUNDS_LOOKED_AT)
    return Timing(reaches, downtimes(rounds, plan.every, now))


def _reaches(
    conn: Connection, plan: RoundPlan, now: datetime.datetime
) -> datetime.date | datetime.datetime | None:
    """The newest date of any calendar stream that has begun: a row put in ahead proves nothing."""
    begun = (
        (began_utc(stream.shape, one.at), one.at)
        for stream in planned_streams(conn, plan)
        if isinstance(stream.shape, CalendarShape) and stream.shape.absent == "zero"
        for one in newest_readings(conn, stream.id)
    )
    newest = max((pair for pair in begun if pair[0] <= now), default=None, key=itemgetter(0))
    return None if newest is None else newest[1]


def _log_shifts(shifts: Iterable[Shift]) -> None:
    for shift in shifts:
        log.info(
            "shift recorded", stream=shift.stream_id, shift=shift.id, origin=shift.origin, late=shift.late
        )
