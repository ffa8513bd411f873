"""Which counts would have been judged earlier, had the program been running. Pure."""

import datetime
from collections.abc import Sequence
from dataclasses import dataclass

from service.round.observe import Place
from storage.rounds import GOOD, NOTHING_NEW, Round

ROUNDS_MISSED = 2


@dataclass(frozen=True, slots=True)
class Downtime:
    """From `since` on nobody read the source, though rounds were due.

    What was complete before `late_before` and came to be known only after `since` is told late.
    """

    since: datetime.datetime
    late_before: datetime.datetime


def downtimes(
    rounds: Sequence[Round], every: datetime.timedelta, now: datetime.datetime
) -> tuple[Downtime, ...]:
    """The stretches without a good round in which rounds were missed.

    `rounds` are the source's newest rounds, newest first, of which those that did not reach it say nothing:
    a source that was down for a month has many. The stretch up to now counts too: what was read
    before a crash may be folded only after it.
    """
    limit = every * ROUNDS_MISSED
    reached = [one.started_utc for one in rounds if one.outcome in (GOOD, NOTHING_NEW)]
    ends = [now, *reached][: len(reached)]
    return tuple(
        Downtime(since, until - limit)
        for since, until in zip(reached, ends, strict=True)
        if until - since > limit
    )


def is_late(place: Place, stretches: Sequence[Downtime]) -> bool:
    """Whether a count was complete long before anybody looked, for want of rounds.

    A source that lags behind, or corrects an old count, makes nothing late.
    """
    known = place.ready_utc if place.read_utc is None else max(place.ready_utc, place.read_utc)
    return any(known >= one.since and place.ready_utc < one.late_before for one in stretches)
