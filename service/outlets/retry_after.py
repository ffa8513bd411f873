"""The header by which a receiver says when to come back (RFC 9110, section 10.2.3). Pure."""

from datetime import datetime
from email.utils import mktime_tz, parsedate_tz

MOST_DIGITS = 12


def retry_after_seconds(value: str | None, now: datetime) -> float | None:
    """Seconds from now, from a number of seconds or any of the three forms of an HTTP date.

    A moment that has passed is 0; what cannot be read is None.
    """
    text = (value or "").strip()
    if text.isascii() and text.isdecimal():
        return float(text[:MOST_DIGITS])
    moment = _http_date(text)
    return None if moment is None else max(0.0, moment - now.timestamp())


def _http_date(text: str) -> float | None:
    try:
        parsed = parsedate_tz(text)
        # A date without a zone means UTC here; mktime_tz would take the machine's.
        return None if parsed is None else float(mktime_tz((*parsed[:9], parsed[9] or 0)))
    except (ValueError, OverflowError, TypeError, IndexError):
        return None
