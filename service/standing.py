"""How a stream stands, in one word. Pure.

A stream that moved lately is not told from a steady one yet: that takes shifts which later counts confirmed.
"""

import datetime
from dataclasses import dataclass
from enum import StrEnum

from service.round.lateness import ROUNDS_MISSED


class Standing(StrEnum):
    """The words, in order of precedence: what comes first hides what comes after it."""

    LATE = "late"
    TOO_SHORT = "too short"
    UNSETTLED = "unsettled"
    STEADY = "steady"


@dataclass(frozen=True, slots=True)
class Bearings:
    """What a stream's standing is made of.

    `last_good_utc` is the start of the last round that reached its source, None if none did. `counts_since`
    is how many counts have come after the one that announced its newest shift, None if it has no shift that
    is emerging.
    """

    last_good_utc: datetime.datetime | None
    every: datetime.timedelta
    counted: int
    fewest_counts: int
    window: int
    counts_since: int | None


def standing(bearings: Bearings, now: datetime.datetime) -> Standing:
    """The first of the words that holds."""
    if is_overdue(bearings.last_good_utc, bearings.every, now):
        return Standing.LATE
    if bearings.counted < bearings.fewest_counts:
        return Standing.TOO_SHORT
    if bearings.counts_since is not None and bearings.counts_since < bearings.window:
        return Standing.UNSETTLED
    return Standing.STEADY


def is_overdue(
    last_good_utc: datetime.datetime | None, every: datetime.timedelta, now: datetime.datetime
) -> bool:
    """Whether a source has not been reached for longer than the rounds that may be missed, or never."""
    return last_good_utc is None or now - last_good_utc > every * ROUNDS_MISSED
