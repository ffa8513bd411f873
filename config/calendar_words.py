"""Intervals and zones, as a person writes them."""

import re
from difflib import get_close_matches
from typing import Annotated, Any
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError, available_timezones

from pydantic import BeforeValidator, Field

from config.part import wrong

MOST_DAYS = 3660
_NAMED = ("hour", "day", "week", "month", "year")
_DAYS = re.compile(r"([1-9][0-9]{0,3}) days?")


def plain_interval(text: str) -> str | None:
    """`hour`, `day`, `14 days`, `week`, `month` or `year`, however it was spaced; None if it is none."""
    plain = " ".join(text.lower().split())
    if plain in _NAMED:
        return plain
    found = _DAYS.fullmatch(plain)
    days = int(found[1]) if found else 0
    if not 1 <= days <= MOST_DAYS:
        return None
    return "day" if days == 1 else f"{days} days"


def is_zone(name: str) -> bool:
    """Whether it names a zone of the IANA time zone database."""
    try:
        ZoneInfo(name)
    except (ZoneInfoNotFoundError, ValueError, OSError):
        return False
    return True


def _interval(raw: Any) -> str:
    plain = plain_interval(raw) if isinstance(raw, str) else None
    if plain is None:
        raise wrong(_nearest(raw, _NAMED))
    return plain


def _zone(raw: Any) -> str:
    if not isinstance(raw, str):
        raise wrong()
    if not is_zone(raw):
        raise wrong(_nearest(raw, sorted(available_timezones())))
    return raw


def _nearest(raw: Any, known: tuple[str, ...] | list[str]) -> str | None:
    found = get_close_matches(raw, known, n=1) if isinstance(raw, str) else []
    return found[0] if found else None


Interval = Annotated[
    str,
    BeforeValidator(_interval),
    Field(description='an interval: "hour", "day", "week", "month", "year", or days such as "14 days"'),
]
Zone = Annotated[
    str,
    BeforeValidator(_zone),
    Field(description='a zone of the IANA time zone database, such as "UTC" or "Europe/Lisbon"'),
]
