"""Days and instants as typed. Pure."""

import datetime
from zoneinfo import ZoneInfo

Moment = datetime.date | datetime.datetime


def aware(moment: Moment, zone: ZoneInfo) -> Moment:
    """A day as it is; an instant typed without a zone is one of the settings' zone."""
    if isinstance(moment, datetime.datetime) and moment.tzinfo is None:
        return moment.replace(tzinfo=zone)
    return moment


def first_instant(moment: Moment, zone: ZoneInfo) -> datetime.datetime:
    """The instant, or the first one of the day in the zone."""
    if isinstance(moment, datetime.datetime):
        return moment if moment.tzinfo is not None else moment.replace(tzinfo=zone)
    return datetime.datetime(moment.year, moment.month, moment.day, tzinfo=zone)
