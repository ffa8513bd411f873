"""Calendar streams: which interval a day or an instant falls into, and when that interval is over. Pure.

An interval is a calendar value in the stream's own zone. A day that a source gave is taken as it stands and
never converted; an instant belongs to the interval under way at that moment in the zone. Every interval has
an integer position, so that the positions of neighbouring intervals differ by exactly one.
"""

import datetime
import re
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal
from zoneinfo import ZoneInfo

At = datetime.date | datetime.datetime
Unit = Literal["hour", "day", "week", "month", "year"]

UTC = datetime.UTC
ANCHOR = datetime.date(1970, 1, 1)
MOST_DAYS = 3660
NEEDED = 'hour, day, week, month, year, or a number of days such as "14 days"'

_HOUR = datetime.timedelta(hours=1)
_EPOCH = datetime.datetime(1970, 1, 1, tzinfo=UTC)
_UNITS: dict[str, Unit] = {"hour": "hour", "day": "day", "week": "week", "month": "month", "year": "year"}
_DAYS = re.compile(r"([1-9][0-9]{0,3}) days?")


class UnusableInterval(ValueError):
    """A text that names no interval."""

    def __init__(self, got: str) -> None:
        self.got = got
        super().__init__(f"An interval must be {NEEDED}; got {got!r}.")


@dataclass(frozen=True, slots=True)
class Interval:
    """What one count covers. `days` is the length when the unit is the day, and 1 otherwise."""

    unit: Unit
    days: int = 1

    def __post_init__(self) -> None:
        if not 1 <= self.days <= (MOST_DAYS if self.unit == "day" else 1):
            raise UnusableInterval(f"{self.days} times one {self.unit}")

    def __str__(self) -> str:
        return self.unit if self.days == 1 else f"{self.days} days"


@dataclass(frozen=True, slots=True)
class Axis:
    """The axis of a calendar stream. Intervals of several days are counted from the anchor."""

    interval: Interval
    zone: ZoneInfo
    anchor: datetime.date = ANCHOR


def parse_interval(text: str) -> Interval:
    """An interval from its name.

    Raises
    ------
    UnusableInterval
        If it is none.
    """
    plain = " ".join(text.lower().split())
    if plain in _UNITS:
        return Interval(_UNITS[plain])
    days = _DAYS.fullmatch(plain)
    if days is None:
        raise UnusableInterval(text)
    return Interval("day", int(days[1]))


def position_of(axis: Axis, at: At) -> int:
    """The position of the interval that a day, or an aware instant, falls into.

    On an axis of hours a day stands for its first hour.
    """
    if not isinstance(at, datetime.datetime):
        return _hour_of(axis.zone, _midnight(axis.zone, at)) if _is_hourly(axis) else _day_position(axis, at)
    if _is_hourly(axis):
        return _hour_of(axis.zone, at)
    return _settle(axis, _day_position(axis, at.astimezone(axis.zone).date()), at)


def start_of(axis: Axis, position: int) -> datetime.datetime:
    """The first instant of an interval, in UTC."""
    if _is_hourly(axis):
        return _EPOCH + position * _HOUR - _hour_shift(axis.zone)
    return _midnight(axis.zone, _first_day(axis, position))


def end_of(axis: Axis, position: int) -> datetime.datetime:
    """The first instant after an interval, in UTC: from then on its count can be complete."""
    return start_of(axis, position + 1)


def at_of(axis: Axis, position: int) -> At:
    """An interval as a calendar value: its first day; for an hour its first instant in the zone."""
    if _is_hourly(axis):
        return start_of(axis, position).astimezone(axis.zone)
    return _first_day(axis, position)


def key_of(axis: Axis, position: int) -> str:
    """The stable key of an interval: the ISO 8601 form of its start."""
    at = at_of(axis, position)
    if not isinstance(at, datetime.datetime):
        return at.isoformat()
    # Seconds only where the zone has them: offsets did before clocks were agreed on.
    return at.isoformat(timespec="seconds" if at.second else "minutes")


def label_of(axis: Axis, position: int) -> str:
    """An interval as people write it: 2026, 2026-03, 2026-W10, 2026-03-02 or 2026-03-02T14:00+01:00."""
    at = at_of(axis, position)
    match axis.interval.unit:
        case "week":
            year, week, _ = at.isocalendar()
            return f"{year:04d}-W{week:02d}"
        case "month":
            return f"{at.year:04d}-{at.month:02d}"
        case "year":
            return f"{at.year:04d}"
        case _:
            return key_of(axis, position)


def last_over(axis: Axis, now: datetime.datetime) -> int:
    """The newest position whose interval is over at an instant."""
    return position_of(axis, now) - 1


def _is_hourly(axis: Axis) -> bool:
    return axis.interval.unit == "hour"


def _day_position(axis: Axis, day: datetime.date) -> int:
    match axis.interval.unit:
        case "week":
            # 1 January of the year 1, ordinal 1, is a Monday.
            return (day.toordinal() - 1) // 7
        case "month":
            return day.year * 12 + day.month - 1
        case "year":
            return day.year
        case _:
            return (day.toordinal() - axis.anchor.toordinal()) // axis.interval.days


def _first_day(axis: Axis, position: int) -> datetime.date:
    match axis.interval.unit:
        case "week":
            return datetime.date.fromordinal(position * 7 + 1)
        case "month":
            return datetime.date(position // 12, position % 12 + 1, 1)
        case "year":
            return datetime.date(position, 1, 1)
        case _:
            return datetime.date.fromordinal(position * axis.interval.days + axis.anchor.toordinal())


def _settle(axis: Axis, position: int, at: datetime.datetime) -> int:
    """Clocks have been put back over midnight, so the date on the wall alone can be off by one interval."""
    if at < start_of(axis, position):
        return position - 1
    while at >= end_of(axis, position):
        position += 1
    return position


def _midnight(zone: ZoneInfo, day: datetime.date) -> datetime.datetime:
    """The first 00:00 of a day; where clocks skip it, the moment at which they do."""
    return datetime.datetime(day.year, day.month, day.day, tzinfo=zone).astimezone(UTC)


def _hour_of(zone: ZoneInfo, at: datetime.datetime) -> int:
    """Hours are counted in UTC, so an hour that comes twice on the wall is two hours here."""
    return (at - _EPOCH + _hour_shift(zone)) // _HOUR


@lru_cache(maxsize=64)
def _hour_shift(zone: ZoneInfo) -> datetime.timedelta:
    """By how much the zone's hours begin before the hours of UTC: half an hour in Kolkata.

    One value for all times, so that positions never repeat where a zone changes its fraction.
    """
    offset = datetime.datetime(2020, 1, 1, tzinfo=zone).utcoffset() or datetime.timedelta()
    return offset % _HOUR
