"""What recurs: the weekday, the month, the hour or another stated cycle that each interval belongs to."""

import calendar
import datetime
from collections.abc import Sequence
from dataclasses import dataclass

from detectors.errors import UnusableParameter

_DAYS = (31.0, 28.2425, 31.0, 30.0, 31.0, 30.0, 31.0, 31.0, 30.0, 31.0, 30.0, 31.0)
"""Days of the months in the mean Gregorian year of 365.2425 days."""


@dataclass(frozen=True, slots=True)
class Cycle:
    """A cycle, and where each interval of a stream stands in it.

    Attributes
    ----------
    name : str
        What recurs.
    labels : tuple of str
        Names of the places of the cycle, two or more.
    weights : tuple of float
        Weight of each place in the average over a cycle, above 0: the days of each month, say.
    place : tuple of int
        The place of each interval, from 0.
    turn : tuple of int
        Which turn of the cycle each interval lies in.

    Raises
    ------
    UnusableParameter
        If these do not fit together.
    """

    name: str
    labels: tuple[str, ...]
    weights: tuple[float, ...]
    place: tuple[int, ...]
    turn: tuple[int, ...]

    def __post_init__(self) -> None:
        if len(self.labels) < 2:
            raise UnusableParameter("labels", self.labels, "two places or more")
        if len(self.weights) != len(self.labels) or not all(weight > 0.0 for weight in self.weights):
            raise UnusableParameter("weights", self.weights, f"{len(self.labels)} numbers above 0")
        if len(self.turn) != len(self.place):
            raise UnusableParameter("turn", len(self.turn), f"as many as places, {len(self.place)}")
        if any(not 0 <= place < len(self.labels) for place in self.place):
            raise UnusableParameter("place", self.place, f"from 0 to {len(self.labels) - 1}")


def weekdays(days: Sequence[datetime.date]) -> Cycle:
    """The weekday of each day, Monday first; a turn is an ISO week.

    Examples
    --------
    >>> weekdays([datetime.date(2026, 3, 2), datetime.date(2026, 3, 8)]).place
    (0, 6)
    """
    return Cycle(
        name="weekday",
        labels=tuple(calendar.day_name),
        weights=(1.0,) * 7,
        place=tuple(day.weekday() for day in days),
        turn=tuple((day.toordinal() - 1) // 7 for day in days),
    )


def months(days: Sequence[datetime.date]) -> Cycle:
    """The month of each interval by its first day, weighted by the days of the months; a turn is a year.

    Examples
    --------
    >>> cycle = months([datetime.date(1969, 1, 1), datetime.date(1970, 12, 1)])
    >>> cycle.place, cycle.turn, round(sum(cycle.weights), 4)
    ((0, 11), (1969, 1970), 365.2425)
    """
    return Cycle(
        name="month",
        labels=tuple(calendar.month_name)[1:],
        weights=_DAYS,
        place=tuple(day.month - 1 for day in days),
        turn=tuple(day.year for day in days),
    )


def hours(instants: Sequence[datetime.datetime]) -> Cycle:
    """The hour of the day in each instant's own zone; a turn is a day.

    Examples
    --------
    >>> hours([datetime.datetime(2026, 3, 2, 14, tzinfo=datetime.UTC)]).place
    (14,)
    """
    return Cycle(
        name="hour",
        labels=tuple(f"{hour:02d}:00" for hour in range(24)),
        weights=(1.0,) * 24,
        place=tuple(instant.hour for instant in instants),
        turn=tuple(instant.toordinal() for instant in instants),
    )


def every(length: int, positions: Sequence[int]) -> Cycle:
    """A cycle of so many intervals, counted from position 0; each place weighs the same.

    Examples
    --------
    >>> every(4, [3, 4, 9]).place
    (3, 0, 1)
    """
    if length < 2:
        raise UnusableParameter("length", length, "at least 2")
    return Cycle(
        name=f"every {length}",
        labels=tuple(str(place) for place in range(length)),
        weights=(1.0,) * length,
        place=tuple(position % length for position in positions),
        turn=tuple(position // length for position in positions),
    )
