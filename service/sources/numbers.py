"""Counts and exposures from what JSON, CSV and databases call a number."""

import math
import re
from decimal import Decimal

from service.sources.values import UnusableValue

LARGEST_COUNT = 2**53
_WHOLE = re.compile(r"[+-]?[0-9]{1,40}(\.0{0,40})?")
_NUMBER = re.compile(r"[+-]?([0-9]{1,40}(\.[0-9]{0,40})?|\.[0-9]{1,40})([eE][+-]?[0-9]{1,3})?")
_SEPARATED = re.compile("[+-]?[1-9][0-9]{0,2}([,.'\u2019_ \u00a0\u2009\u202f][0-9]{3})+([.,][0-9]*)?")


def read_count(value: object) -> int | None:
    """A count from 0 to 2^53. 12.0 is 12 and "12" is 12; nothing at all is a missing count.

    Raises
    ------
    UnusableValue
        If it is negative, fractional, true or false, not a number, not finite, or beyond 2^53.
    """
    number = _number(value)
    if number is None:
        return None
    if number < 0:
        raise UnusableValue("count", "0 or more", value)
    # A binary fraction of that size may have been another count before it was rounded.
    if number > LARGEST_COUNT or (isinstance(number, float) and number >= LARGEST_COUNT):
        raise UnusableValue("count", "at most 2^53", value)
    if number != int(number):
        raise UnusableValue("count", "a whole number", value)
    return int(number)


def read_exposure(value: object) -> float | None:
    """An exposure above 0; nothing at all is an unknown one."""
    if _is_empty(value):
        return None
    if isinstance(value, str) and _NUMBER.fullmatch(value.strip()):
        number = float(value)
    elif isinstance(value, int | float | Decimal) and not isinstance(value, bool):
        number = _float(value)
    else:
        raise UnusableValue("exposure", "a number", value)
    if not 0.0 < number < math.inf:
        raise UnusableValue("exposure", "a finite number above 0", value)
    return number


def _number(value: object) -> int | float | Decimal | None:
    if _is_empty(value):
        return None
    if isinstance(value, str):
        return _from_text(value.strip(), value)
    if isinstance(value, bool) or not isinstance(value, int | float | Decimal):
        raise UnusableValue("count", "a whole number", value)
    if not _is_finite(value):
        raise UnusableValue("count", "a finite number", value)
    return value


def _from_text(text: str, value: object) -> int:
    # Before anything else: 12.000 is twelve to one program and twelve thousand to another.
    if _SEPARATED.fullmatch(text):
        raise UnusableValue("count", "a number without thousands separators, which are not guessed", value)
    if _WHOLE.fullmatch(text):
        return int(text.partition(".")[0])
    if _NUMBER.fullmatch(text):
        raise UnusableValue("count", "a whole number, written without an exponent", value)
    raise UnusableValue("count", "a whole number, or empty where it is missing", value)


def _is_empty(value: object) -> bool:
    return value is None or (isinstance(value, str) and not value.strip())


def _is_finite(number: int | float | Decimal) -> bool:
    """Without a detour over floats, which neither hold a large decimal nor take a signalling NaN."""
    return (
        number.is_finite()
        if isinstance(number, Decimal)
        else isinstance(number, int) or math.isfinite(number)
    )


def _float(number: int | float | Decimal) -> float:
    try:
        return float(number) if _is_finite(number) else math.nan
    except OverflowError:
        return math.inf
