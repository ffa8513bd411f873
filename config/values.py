"""The single values of the settings: numbers, texts, times, places."""

import codecs
import datetime
import math
from collections.abc import Callable
from pathlib import Path
from typing import Annotated
from zoneinfo import ZoneInfo

from config import durations, intervals
from config.durations import duration_text, parse_duration
from config.intervals import Interval, parse_interval
from config.shown import HIDDEN, quoted
from config.takes import Surroundings, Takes, Unfit, as_it_is

LONGEST_TEXT = 200
LONGEST_QUERY = 20_000
LONGEST_LIST = 32
ZONE_NEEDED = 'a zone of the IANA database such as "Europe/Berlin" or "UTC"'


def required_text(value: object, longest: int = LONGEST_TEXT) -> str:
    """A text with something in it, on one line."""
    if not isinstance(value, str) or not value.strip() or len(value) > longest or not value.isprintable():
        raise Unfit
    return value


def whole(least: int, most: int) -> Takes:
    """A whole number within bounds."""

    def read(value: object, _around: Surroundings) -> int:
        if isinstance(value, bool) or not isinstance(value, int) or not least <= value <= most:
            raise Unfit
        return value

    return Takes(f"a whole number from {least} to {most}", read, as_it_is)


def number(needed: str, fits: Callable[[float], bool]) -> Takes:
    """A number for which something holds."""
    return Takes(needed, lambda value, _around: _number(value, fits), as_it_is)


def text(needed: str, longest: int = LONGEST_TEXT) -> Takes:
    """A text on one line."""
    return Takes(needed, lambda value, _around: required_text(value, longest), as_it_is)


def duration(least: str, most: str) -> Takes:
    """A length of time within bounds."""
    low, high = parse_duration(least), parse_duration(most)

    def read(value: object, _around: Surroundings) -> datetime.timedelta:
        found = parse_duration(required_text(value))
        if not low <= found <= high:
            raise Unfit
        return found

    return Takes(f"{durations.NEEDED}, from {least} to {most}", read, duration_text)


def _number(value: object, fits: Callable[[float], bool]) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise Unfit
    try:
        found = float(value)
    except OverflowError:
        raise Unfit from None
    if not fits(found):
        raise Unfit
    return found


def _zone(value: object, _around: Surroundings) -> ZoneInfo:
    name = required_text(value)
    try:
        return ZoneInfo(name)
    except (ValueError, OSError, KeyError):
        raise Unfit from None


def _interval(value: object, _around: Surroundings) -> Interval:
    return parse_interval(required_text(value))


def _day(value: object, _around: Surroundings) -> datetime.date:
    if isinstance(value, datetime.date) and not isinstance(value, datetime.datetime):
        return value
    return datetime.datetime.strptime(required_text(value), "%Y-%m-%d").replace(tzinfo=datetime.UTC).date()


def _path(value: object, around: Surroundings) -> Path:
    written = required_text(value, 4096)
    if "://" in written:
        raise Unfit(HIDDEN)
    if written.startswith("~"):
        raise Unfit(f"{quoted(written)}, whose ~ would not be filled in")
    return around.folder / written


def _name(value: object, _around: Surroundings) -> str:
    name = required_text(value, 100)
    if "/" in name or name != name.strip():
        raise Unfit
    return name


def _query(value: object, _around: Surroundings) -> str:
    if not isinstance(value, str) or not value.strip() or len(value) > LONGEST_QUERY or "\0" in value:
        raise Unfit("nothing that could be a query")
    return value


def _delimiter(value: object, _around: Surroundings) -> str:
    if not isinstance(value, str) or len(value) != 1 or value in '"\r\n\0':
        raise Unfit
    return value


def _encoding(value: object, _around: Surroundings) -> str:
    try:
        found = codecs.lookup(required_text(value))
        # Some codecs turn bytes into bytes; a table needs one that gives text.
        b"".decode(found.name)
    except LookupError:
        raise Unfit from None
    return found.name


def _dispersions(value: object, _around: Surroundings) -> tuple[float, ...]:
    values = tuple(_number(one, lambda number: number > 0.0) for one in _some(value))
    _require_different(values)
    return values


def _wanders(value: object, _around: Surroundings) -> tuple[tuple[float, float], ...]:
    pairs = tuple(_weighted(one) for one in _some(value))
    _require_different([wander for wander, _ in pairs])
    return pairs


def _weighted(value: object) -> tuple[float, float]:
    if not isinstance(value, list) or len(value) != 2:
        raise Unfit
    wander = _number(value[0], lambda number: 0.0 <= number <= 1.0)
    return wander, _number(value[1], lambda number: 0.0 < number < math.inf)


def _some(value: object) -> list[object]:
    if not isinstance(value, list) or not 1 <= len(value) <= LONGEST_LIST:
        raise Unfit
    return value


def _require_different(values: tuple[float, ...] | list[float]) -> None:
    if len(set(values)) < len(values):
        raise Unfit("a list with a value twice")


def _values(value: object, _around: Surroundings) -> tuple[str, ...]:
    if not isinstance(value, list) or not value or not all(isinstance(one, str) and one for one in value):
        raise Unfit
    return tuple(value)


Name = Annotated[str, Takes('a name of at most 100 signs, without "/" in it', _name, as_it_is)]
Title = Annotated[str, text(f"a text of 1 to {LONGEST_TEXT} signs on one line")]
Values = Annotated[tuple[str, ...], Takes('a list of one or more texts such as ["one", "two"]', _values, as_it_is)]
Zone = Annotated[ZoneInfo, Takes(ZONE_NEEDED, _zone)]
CalendarInterval = Annotated[Interval, Takes(intervals.NEEDED, _interval)]
Day = Annotated[datetime.date, Takes("a day such as 2026-03-02", _day)]
PathHere = Annotated[Path, Takes("a path, absolute or from the folder of this file", _path)]
Query = Annotated[str, Takes(f"one SELECT, of at most {LONGEST_QUERY} signs", _query, as_it_is)]
Delimiter = Annotated[str, Takes('a single sign such as "," or ";"', _delimiter, as_it_is)]
Encoding = Annotated[str, Takes('an encoding that Python knows, such as "utf-8"', _encoding, as_it_is)]
Column = Annotated[str, text("the name of a column")]

Every = Annotated[datetime.timedelta, duration("1s", "366d")]
Deadline = Annotated[datetime.timedelta, duration("1s", "1h")]
Stop = Annotated[datetime.timedelta, duration("1s", "10m")]
Wait = Annotated[datetime.timedelta, duration("0s", "3660d")]
Bytes = Annotated[int, whole(1, 1_000_000_000)]
Pages = Annotated[int, whole(1, 10_000)]
Rows = Annotated[int, whole(1, 10_000_000)]

Threshold = Annotated[float, number("a number above 0 and below 1", lambda value: 0.0 < value < 1.0)]
Window = Annotated[int, whole(1, 1000)]
Lasting = Annotated[int, whole(1, 1000)]
FewestCounts = Annotated[int, whole(1, 100_000)]
MeanGap = Annotated[float, number("a number from 1 to 1000000", lambda value: 1.0 <= value <= 1e6)]
GapShape = Annotated[int, whole(1, 100)]
SmallestShift = Annotated[
    float, number("a share from 0 to 10, such as 0.15 for 15 %", lambda value: 0.0 <= value <= 10.0)
]
OneOffShare = Annotated[
    float, number("a share of at least 0 and below 1, such as 0.02 for 2 %", lambda value: 0.0 <= value < 1.0)
]
Dispersions = Annotated[
    tuple[float, ...],
    Takes(f"a list of 1 to {LONGEST_LIST} different numbers above 0, such as [4, 16, inf]", _dispersions, as_it_is),
]
Wanders = Annotated[
    tuple[tuple[float, float], ...],
    Takes(
        f"a list of 1 to {LONGEST_LIST} pairs [wander from 0 to 1, weight above 0], such as [[0.01, 1], [0.02, 0.5]]",
        _wanders,
        as_it_is,
    ),
]
