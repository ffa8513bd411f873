"""Lengths of time and sizes of documents, as a person writes them."""

import datetime
import re
from typing import Annotated, Any

from pydantic import BeforeValidator, Field, PlainSerializer

from config.part import wrong

_DURATION = re.compile(r"([0-9]{1,7})([smhdw])")
_SECONDS = {"s": 1, "m": 60, "h": 3600, "d": 86400, "w": 604800}
_SIZE = re.compile(r"([0-9]{1,6})(kB|MB|GB)")
_BYTES = {"kB": 1000, "MB": 1000**2, "GB": 1000**3}

DAY = datetime.timedelta(days=1)


def parse_duration(text: str) -> datetime.timedelta | None:
    """`90s`, `15m`, `1h`, `7d` or `2w`; None if it is none."""
    found = _DURATION.fullmatch(text)
    return datetime.timedelta(seconds=int(found[1]) * _SECONDS[found[2]]) if found else None


def write_duration(value: datetime.timedelta) -> str:
    """The shortest way to write whole seconds."""
    seconds = int(value.total_seconds())
    unit = next(unit for unit in "wdhms" if seconds % _SECONDS[unit] == 0 and (seconds or unit == "s"))
    return f"{seconds // _SECONDS[unit]}{unit}"


def parse_size(text: str) -> int | None:
    """`500kB`, `25MB` or `1GB` in bytes; None if it is none."""
    found = _SIZE.fullmatch(text)
    return int(found[1]) * _BYTES[found[2]] if found else None


def _duration(raw: Any) -> datetime.timedelta:
    if isinstance(raw, datetime.timedelta):
        return raw
    found = parse_duration(raw) if isinstance(raw, str) else None
    if found is None:
        raise wrong()
    return found


def _size(raw: Any) -> int:
    if isinstance(raw, int) and not isinstance(raw, bool):
        return raw
    found = parse_size(raw) if isinstance(raw, str) else None
    if found is None:
        raise wrong()
    return found


Duration = Annotated[
    datetime.timedelta, BeforeValidator(_duration), PlainSerializer(write_duration, when_used="json")
]

Every = Annotated[
    Duration,
    Field(
        ge=datetime.timedelta(seconds=1),
        le=366 * DAY,
        description='a duration from "1s" to "366d", such as "15m", "1h" or "1d"',
    ),
]
Deadline = Annotated[
    Duration,
    Field(
        ge=datetime.timedelta(seconds=1),
        le=datetime.timedelta(hours=1),
        description='a duration from "1s" to "1h", such as "90s"',
    ),
]
Age = Annotated[
    Duration,
    Field(
        ge=datetime.timedelta(0),
        le=3660 * DAY,
        description='a duration from "0s" to "3660d", such as "36h", "7d" or "2w"',
    ),
]
Size = Annotated[
    int,
    BeforeValidator(_size),
    Field(ge=1000, le=1000**3, description='a size from "1kB" to "1GB", such as "25MB"'),
]
