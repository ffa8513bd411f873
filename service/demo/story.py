"""The invented house: its shows, and what each is made to count on each day. Pure.

Pellowick House does not exist, nor do its shows, and no count here was measured. The counts are negative
binomial draws, and SEED names the draw that is shown. It is an ordinary one: of the seeds 1 to 60, 59 ring
for the fall after 2 to 9 of its counts, and for nothing else in the 65 days from the first poll on; the other
one rings falsely for another show as well.
"""

import datetime
import hashlib
import math
from dataclasses import dataclass

HOUSE = "Pellowick House"
UNIT = "listens"
SEED = 49
HISTORY_DAYS = 120
"""So many days are over when the source is read for the first time."""


@dataclass(frozen=True, slots=True)
class Turn:
    """From day `day` on the level is `times` what it was before."""

    day: int
    times: float


@dataclass(frozen=True, slots=True)
class Show:
    """A show: level and dispersion of its daily counts, and what happens to it."""

    name: str
    level: float
    dispersion: float
    turns: tuple[Turn, ...] = ()
    hits: tuple[Turn, ...] = ()


HIT = Turn(HISTORY_DAYS + 7, 30.0)
FALL = Turn(HISTORY_DAYS + 13, 0.55)
HIT_SHOW = Show("Quarter to Fennel", 900, 14, hits=(HIT,))
FALLING_SHOW = Show("The Moss Parliament", 2400, 20, turns=(FALL,))
SHOWS = (
    Show("A Ladder for Owls", 620, 16, turns=(Turn(52, 1.7),)),
    Show("Nine Borrowed Kettles", 1500, 12),
    HIT_SHOW,
    FALLING_SHOW,
    Show("The Thursday Cartographer", 310, 25),
    Show("Tidewrack Almanac", 3800, 18, turns=(Turn(86, 0.6),)),
)


def level_of(show: Show, day: int) -> float:
    """The mean of the show's count on a day, one-offs aside."""
    level = show.level
    for turn in show.turns:
        if day >= turn.day:
            level *= turn.times
    return level


def count_of(show: Show, day: int, *, seed: int = SEED) -> int:
    """The show's count on a day (0 is the first): the same whenever it is asked for."""
    # Loaded only where counts are made, since importing it takes its time.
    from scipy.special import nbdtrik

    share = show.dispersion / (show.dispersion + level_of(show, day))
    drawn = math.ceil(nbdtrik(_uniform(f"{seed} {show.name} {day}"), show.dispersion, share))
    return round(drawn * next((hit.times for hit in show.hits if hit.day == day), 1.0))


@dataclass(frozen=True, slots=True)
class Almanac:
    """Which date a day of the story has; day 0 is `first`."""

    first: datetime.date

    def date(self, day: int) -> datetime.date:
        """The date of a day of the story."""
        return self.first + datetime.timedelta(days=day)

    def days_over(self, now: datetime.datetime) -> int:
        """How many days of the story are over at an instant; days begin and end in UTC."""
        return (now.astimezone(datetime.UTC).date() - self.first).days


def _uniform(key: str) -> float:
    """A number between 0 and 1 that depends on the key alone, on every machine and in every version."""
    drawn = int.from_bytes(hashlib.sha256(key.encode()).digest()[:6], "big")
    return (drawn + 0.5) / 2**48
