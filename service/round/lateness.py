"""Which counts would have been judged earlier, had the program been running. Pure."""

import datetime
from collections.abc import Sequence

from storage.rounds import GOOD, NOTHING_NEW, Round

ROUNDS_MISSED = 2


def late_before(
    rounds: Sequence[Round], every: datetime.timedelta, now: datetime.datetime
) -> datetime.datetime | None:
    """The instant before which a count was complete too long ago to be told as fresh; None if none was.

    `rounds` are the source's newest rounds, newest first. Counts are late when the good round before the
    last lies so far back that rounds were missed in between: it is told late, and says so.
    """
    reached = [one.started_utc for one in rounds if one.outcome in (GOOD, NOTHING_NEW)]
    limit = every * ROUNDS_MISSED
    if len(reached) < 2 or now - reached[1] <= limit:
        return None
    return now - limit
