"""Whether a stream's counts are still of the kind that is stored: of releases, or of the same intervals."""

from sqlalchemy import Connection

from service.round.observe import UnusableReadings, place_readings
from service.round.plans import CalendarShape, StreamPlan, shape_word
from storage.readings import newest_readings
from storage.streams import find_stream


class OtherShape(UnusableReadings):
    """A stream of calendar counts is now said to be one of releases, or the other way round."""

    def __init__(self, stream_id: str, stored: str, planned: str) -> None:
        super().__init__(
            f"Stream {stream_id!r} holds counts of the shape {stored!r}; its settings now say {planned!r}. "
            "Put the former shape back, or rename the source, so that its streams begin anew."
        )


def require_same_kind(conn: Connection, plan: StreamPlan) -> None:
    """Hold a stream whose settings have changed against what is stored of it.

    Else a day's count and a week's would stand in one series as if they were alike. (Weeks that are now said
    to be days cannot be told from days of which most are absent.)

    Raises
    ------
    OtherShape
        If the stream was of another shape.
    service.round.observe.OtherIntervals
        If its counts were stored for another interval or zone.
    """
    stored = find_stream(conn, plan.id)
    if stored is None or stored.fingerprint == plan.fingerprint:
        return
    if stored.shape != shape_word(plan.shape):
        raise OtherShape(plan.id, stored.shape, shape_word(plan.shape))
    if isinstance(plan.shape, CalendarShape):
        place_readings(plan.id, plan.shape, newest_readings(conn, plan.id))
