"""The interval of a record from the spacing of its rows. Pure."""

import datetime
from collections import Counter
from collections.abc import Sequence
from itertools import pairwise

from service.replay.errors import NoSpacing
from service.round.calendar import MOST_DAYS, Interval

At = datetime.date | datetime.datetime

_HOUR = datetime.timedelta(hours=1)
_DAY = datetime.timedelta(days=1)
_SHORTEST_MONTH = 28


def infer_interval(moments: Sequence[At]) -> Interval:
    """The interval whose length is the commonest spacing; the longer one where two are equally common.

    Spacings of 28 days and more are months or years where the rows keep to one day of the month; quarters
    are months too, with gaps of three.

    Raises
    ------
    NoSpacing
        If there are fewer than two different moments, or they lie closer than an hour.
    """
    ordered = sorted(set(map(_comparable, moments)))
    if len(ordered) < 2:
        raise NoSpacing("there are fewer than two different dates")
    spacing = _commonest([later - earlier for earlier, later in pairwise(ordered)])
    if spacing < _HOUR:
        raise NoSpacing(f"the commonest spacing is {spacing}, and the shortest interval is an hour")
    if spacing < _DAY - _HOUR:
        return Interval("hour")
    # Rounded, since a day has 23 or 25 hours where clocks are changed.
    return _of_days([wall_date(moment) for moment in moments], round(spacing / _DAY))


def wall_date(moment: At) -> datetime.date:
    """The date as written, in whatever zone it was written."""
    return moment.date() if isinstance(moment, datetime.datetime) else moment


def _of_days(dates: Sequence[datetime.date], days: int) -> Interval:
    if days == 7:
        return Interval("week")
    if days >= _SHORTEST_MONTH and _keep_to_one_day(dates):
        one_month = len({date.month for date in dates}) == 1
        return Interval("year") if one_month else Interval("month")
    return Interval("day", min(days, MOST_DAYS))


def _keep_to_one_day(dates: Sequence[datetime.date]) -> bool:
    """On one day of the month, or on the last one."""
    after = [date + datetime.timedelta(days=1) for date in dates]
    return any(len({date.day for date in each}) == 1 for each in (dates, after))


def _commonest(spacings: Sequence[datetime.timedelta]) -> datetime.timedelta:
    counted = Counter(spacings)
    return max(counted, key=lambda spacing: (counted[spacing], spacing))


def _comparable(moment: At) -> datetime.datetime:
    """Days among themselves keep their distance; beside instants a day is its first moment in UTC."""
    if isinstance(moment, datetime.datetime):
        return moment.astimezone(datetime.UTC)
    return datetime.datetime(moment.year, moment.month, moment.day, tzinfo=datetime.UTC)
