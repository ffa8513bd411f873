"""When a hush ends. Pure."""

import datetime
from zoneinfo import ZoneInfo

from service.cli.errors import WrongUse


def end_of_hush(
    until: datetime.date | datetime.datetime | None, lift: bool, now: datetime.datetime, zone: ZoneInfo
) -> datetime.datetime | None:
    """The instant at which alerts are sent again; None for at once. A day means its beginning in the zone.

    Raises
    ------
    WrongUse
        If both or neither were said, or the instant has passed.
    """
    if lift == (until is not None):
        raise WrongUse("hush needs one of --until DATE and --lift.")
    if until is None:
        return None
    ends = _instant(until, zone)
    if ends <= now:
        raise WrongUse(f"--until must lie ahead; {until.isoformat()} has passed. To end a hush, use --lift.")
    return ends


def _instant(until: datetime.date | datetime.datetime, zone: ZoneInfo) -> datetime.datetime:
    if not isinstance(until, datetime.datetime):
        return datetime.datetime(until.year, until.month, until.day, tzinfo=zone)
    return until if until.tzinfo is not None else until.replace(tzinfo=zone)
