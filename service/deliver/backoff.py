"""When a delivery is tried again, and when it is given up. Pure.

Fourteen attempts over five days: a receiver that is down over a long week-end still gets its alerts. What
counts is attempts, not age, so that a daemon that was switched off for a week gives nothing up unsent.
"""

from collections.abc import Callable
from dataclasses import dataclass
from datetime import timedelta

from service.outlets.outlet import Kind, Outcome

MINUTE, HOUR, DAY = 60.0, 3600.0, 86_400.0
WAITS_SECONDS = (
    10.0,
    30.0,
    2 * MINUTE,
    10 * MINUTE,
    30 * MINUTE,
    HOUR,
    3 * HOUR,
    6 * HOUR,
    12 * HOUR,
    DAY,
    DAY,
    DAY,
    DAY,
)
MOST_ATTEMPTS = len(WAITS_SECONDS) + 1
LONGEST_RETRY_AFTER_SECONDS = DAY
JITTER = 0.2

Chance = Callable[[], float]


@dataclass(frozen=True, slots=True)
class Again:
    """Try again after this long."""

    wait: timedelta


@dataclass(frozen=True, slots=True)
class GiveUp:
    """Do not try again, for this reason."""

    why: str


def after_failure(outcome: Outcome, attempts: int, chance: Chance) -> Again | GiveUp:
    """What follows a failed attempt.

    `attempts` counts it. `chance` gives numbers from 0 up to 1 and lengthens the wait by up to a fifth, so
    that what failed together is not tried together; it never shortens what `Retry-After` asked for.
    """
    if outcome.kind is Kind.ENDED:
        return GiveUp("The receiver wants no more.")
    if attempts >= MOST_ATTEMPTS:
        return GiveUp(f"Given up after {attempts} attempts.")
    return Again(timedelta(seconds=_wait_seconds(outcome, attempts) * (1.0 + JITTER * chance())))


def hold_seconds(outcome: Outcome) -> float | None:
    """For how long the receiver wants to be left alone, capped; None if it did not say."""
    asked = outcome.retry_after_seconds
    return None if asked is None else min(asked, LONGEST_RETRY_AFTER_SECONDS)


def _wait_seconds(outcome: Outcome, attempts: int) -> float:
    return max(WAITS_SECONDS[max(attempts, 1) - 1], hold_seconds(outcome) or 0.0)
