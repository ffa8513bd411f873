"""When a hush ends. Pure."""

import datetime
from zoneinfo import ZoneInfo

from service.cli.errors import WrongUse
from service.cli.moments import Moment, first_instant


def end_of_hush(
    until: Moment | None, lift: bool, now: datetime.datetime, zone: ZoneInfo
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
    ends = first_instant(until, zone)
    if ends <= now:
        raise WrongUse(f"--until must lie ahead; {until.isoformat()} has passed. To end a hush, use --lift.")
    return ends
