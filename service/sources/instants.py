"""Dates and date-times of ISO 8601, nothing else: a date of another form is not guessed."""

import datetime
import re
from zoneinfo import ZoneInfo

from service.sources.values import UnusableValue

FIRST_YEAR, LAST_YEAR = 1000, 9000
NEEDED = "a date or date-time of ISO 8601, such as 2026-03-02, 2026-03-02T14:00Z, 2026-W10 or 2026-03"
_DAY = re.compile(r"[0-9]{4}-[0-9]{2}-[0-9]{2}|[0-9]{8}|[0-9]{4}-W[0-9]{2}(-[1-7])?|[0-9]{4}W[0-9]{2}[1-7]?")
_MONTH = re.compile(r"[0-9]{4}-[0-9]{2}")
_YEAR = re.compile(r"[0-9]{4}")
_TIME = re.compile(r"[0-9]{2}(:?[0-9]{2}(:?[0-9]{2}([.,][0-9]{1,12})?)?)?(Z|[+-][0-9]{2}(:?[0-9]{2})?)?")


def read_at(value: object, zone: ZoneInfo) -> datetime.date | datetime.datetime:
    """The day or instant of a row; a week, month or year is its first day.

    A date-time without a zone is read in `zone`; where clocks are put back, it is the first of the two.

    Raises
    ------
    UnusableValue
        If it is nothing, another form, or no such day.
    """
    read = _read(value)
    if not FIRST_YEAR <= read.year <= LAST_YEAR:
        raise UnusableValue("at", f"between the years {FIRST_YEAR} and {LAST_YEAR}", value)
    if isinstance(read, datetime.datetime) and read.tzinfo is None:
        return read.replace(tzinfo=zone)
    return read


def _read(value: object) -> datetime.date | datetime.datetime:
    if isinstance(value, datetime.date):
        return value
    if not isinstance(value, str):
        raise UnusableValue("at", NEEDED, value)
    try:
        return _from_text(value.strip().upper(), value)
    except ValueError as error:
        if isinstance(error, UnusableValue):
            raise
        raise UnusableValue("at", "a day and time that exist", value) from None


def _from_text(text: str, value: object) -> datetime.date | datetime.datetime:
    if _YEAR.fullmatch(text):
        return datetime.date(int(text), 1, 1)
    if _MONTH.fullmatch(text):
        return datetime.date.fromisoformat(text + "-01")
    if _DAY.fullmatch(text):
        return datetime.date.fromisoformat(text)
    day, _, time = text.replace(" ", "T", 1).partition("T")
    if _DAY.fullmatch(day) and _TIME.fullmatch(time):
        return datetime.datetime.fromisoformat(f"{day}T{time}")
    raise UnusableValue("at", NEEDED, value)
