"""One round of one source: read its document and keep what it says."""

import datetime
from dataclasses import dataclass, replace

from service.clock import Clock
from service.logs import log
from service.round.keep import KeptDocument, keep, planned_streams
from service.round.observe import UnusableReadings
from service.round.plans import RoundPlan
from service.round.ripen import came_to_age
from service.sources.document import Document, Validators
from service.sources.errors import SourceUnreadable
from service.sources.open_source import Tools, read_document
from service.sources.plans import fingerprint
from storage.engine import Store
from storage.errors import StoreError
from storage.rounds import FAILED, GOOD, NOTHING_NEW, begin_round, end_round
from storage.validators import find_validators


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
    except (SourceUnreadable, UnusableReadings, StoreError) as error:
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


def remark(store: Store, outcome: RoundOutcome, sentence: str, clock: Clock) -> RoundOutcome:
    """Add a sentence to what the record of a round says."""
    message = sentence if outcome.message is None else f"{outcome.message} {sentence}"
    with store.writing() as conn:
        end_round(conn, outcome.round_id, outcome.outcome, now=clock.now(), message=message)
    return replace(outcome, message=message)


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
