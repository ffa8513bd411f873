"""What one count of a calendar stream covers, read off two of its counts. Pure.

The tables know where a count stands and its date, not the setting; two places on an axis tell it.
"""

import datetime
from collections.abc import Sequence

from service.tell.story import At, Marker

DAYS = {1: "day", 7: "week"}


def unit_of(markers: Sequence[Marker]) -> str | None:
    """Such as "week" or "14 days"; None where the markers stand at one place or do not agree."""
    ordered = sorted(markers, key=lambda marker: marker.position)
    if len(ordered) < 2 or ordered[0].position == ordered[-1].position:
        return None
    first, last = ordered[0], ordered[-1]
    return _unit(first.at, last.at, last.position - first.position)


def _unit(first: At, last: At, places: int) -> str | None:
    if isinstance(first, datetime.datetime) or isinstance(last, datetime.datetime):
        return _hour(first, last, places)
    months = (last.year - first.year) * 12 + last.month - first.month
    if first.day == last.day == 1 and months == places:
        return "month"
    if (first.month, first.day) == (last.month, last.day) == (1, 1) and months == 12 * places:
        return "year"
    days, rest = divmod((last - first).days, places)
    if rest or days < 1:
        return None
    return DAYS.get(days, f"{days} days")


def _hour(first: At, last: At, places: int) -> str | None:
    if not isinstance(first, datetime.datetime) or not isinstance(last, datetime.datetime):
        return None
    return "hour" if last - first == datetime.timedelta(hours=places) else None
