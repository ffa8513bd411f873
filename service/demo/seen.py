"""What the daemon has done so far, as its database has it."""

import datetime
from collections.abc import Mapping
from dataclasses import dataclass

from service.demo.place import SOURCE, stream_id
from service.demo.story import FALLING_SHOW, HISTORY_DAYS, HIT_SHOW, Almanac
from storage.engine import Store
from storage.posteriors import StoredPosterior, history, newest_posteriors
from storage.rounds import Round, list_rounds
from storage.shifts import HISTORY, LIVE, Shift, list_shifts

MOST_ROUNDS = 10_000


@dataclass(frozen=True, slots=True)
class Seen:
    """The rounds that have ended and the shifts, the oldest first.

    `folded` is the number of shows that have been folded; `hit` and `fall` are the days of these two shows
    since the first poll.
    """

    rounds: tuple[Round, ...]
    folded: int
    found_in_history: tuple[Shift, ...]
    live: tuple[Shift, ...]
    hit: Mapping[datetime.date, StoredPosterior]
    fall: Mapping[datetime.date, StoredPosterior]


def look(store: Store, almanac: Almanac) -> Seen:
    """One consistent picture."""
    begin = almanac.date(HISTORY_DAYS)
    with store.reading() as conn:
        rounds = list_rounds(conn, source=SOURCE, limit=MOST_ROUNDS)
        newest = newest_posteriors(conn)
        shifts = list_shifts(conn)
        hit = history(conn, stream_id(HIT_SHOW.name), since=begin)
        fall = history(conn, stream_id(FALLING_SHOW.name), since=begin)
    return Seen(
        rounds=tuple(one for one in reversed(rounds) if one.ended_utc is not None),
        folded=len(newest),
        found_in_history=tuple(one for one in reversed(shifts) if one.origin == HISTORY),
        live=tuple(one for one in reversed(shifts) if one.origin == LIVE),
        hit={one.at: one for one in hit},
        fall={one.at: one for one in fall},
    )
