"""One attempt at one delivery, and its record."""

import traceback
from dataclasses import dataclass
from datetime import datetime, timedelta
from pathlib import Path

from service.clock import Clock
from service.deliver.backoff import Again, Chance, GiveUp, after_failure, hold_seconds
from service.outlets.outlet import Kind, Outcome, Outlet
from storage.engine import Store
from storage.outbox import Attempt, Delivery, claim_due, record_failure, record_last_failure, record_success

GIVEN_UP = "given up"
# On top of the longest attempt: what a busy machine may take to send and to record.
CLAIM_SECONDS = 15.0
MOST_PUT_OFF = 1000


@dataclass(frozen=True, slots=True)
class Report:
    """What came of one attempt, in the words of its record, for whoever watches.

    `hold_seconds` is for how long the receiver wants to be left alone, None if it did not say.
    """

    delivery_id: str
    outlet: str
    shift_id: str | None
    outcome: str
    status: int | None
    error: str | None
    took_seconds: float
    hold_seconds: float | None = None


def claim_next(store: Store, outlet: Outlet, clock: Clock, due_by: datetime) -> Delivery | None:
    """The outlet's longest due delivery, put off for as long as an attempt may take.

    Nobody else sends it meanwhile; if this process dies, it is due again afterwards under the same id.
    """
    until = clock.now() + timedelta(seconds=outlet.attempt_seconds + CLAIM_SECONDS)
    with store.writing() as conn:
        claimed = claim_due(conn, now=due_by, until=until, outlet=outlet.name, limit=1)
    return claimed[0] if claimed else None


def attempt(store: Store, outlet: Outlet, delivery: Delivery, clock: Clock, chance: Chance) -> Report:
    """Send once, with no transaction open, and record what came of it in one short transaction."""
    began, at = clock.monotonic(), clock.now()
    outcome = _sent(outlet, delivery, at)
    took = clock.monotonic() - began
    following = _following(outcome, delivery, chance)
    made = Attempt(at, _word(outcome, following), outcome.status, outcome.error, took)
    with store.writing() as conn:
        if following is None:
            record_success(conn, delivery.id, made)
        elif isinstance(following, Again):
            record_failure(conn, delivery.id, made, due_utc=clock.now() + following.wait)
        else:
            record_last_failure(conn, delivery.id, made)
    return _report(outlet.name, delivery, made, hold_seconds(outcome))


def put_off(store: Store, outlet: Outlet, clock: Clock, due_by: datetime, seconds: float) -> int:
    """Leave a receiver alone: what else was due at it is due again later, without an attempt counted."""
    until = clock.now() + timedelta(seconds=seconds)
    with store.writing() as conn:
        return len(claim_due(conn, now=due_by, until=until, outlet=outlet.name, limit=MOST_PUT_OFF))


def _report(outlet: str, delivery: Delivery, made: Attempt, hold: float | None) -> Report:
    return Report(
        delivery_id=delivery.id,
        outlet=outlet,
        shift_id=delivery.shift_id,
        outcome=made.outcome,
        status=made.status,
        error=made.error,
        took_seconds=made.took_seconds,
        hold_seconds=hold,
    )


def _sent(outlet: Outlet, delivery: Delivery, at: datetime) -> Outcome:
    try:
        return outlet.send(delivery.id, delivery.body, at)
    except Exception as error:  # One attempt must not end the delivering; its record says what happened.
        return Outcome(Kind.TRY_LATER, error=f"Unexpected {type(error).__name__} {_where(error)}.")


def _where(error: Exception) -> str:
    """The place of an unexpected error. Its text stays out: it may quote an address."""
    frames = traceback.extract_tb(error.__traceback__)
    last = frames[-1]
    return f"in {Path(last.filename).name}, line {last.lineno}"


def _following(outcome: Outcome, delivery: Delivery, chance: Chance) -> Again | GiveUp | None:
    if outcome.kind is Kind.DELIVERED:
        return None
    return after_failure(outcome, delivery.attempts + 1, chance)


def _word(outcome: Outcome, following: Again | GiveUp | None) -> str:
    """The attempt's outcome as it is recorded: given up, or what the outlet said."""
    return GIVEN_UP if isinstance(following, GiveUp) else outcome.kind.value
