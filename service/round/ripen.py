"""Which reading holds at a release's final age, when the final age itself has changed."""

from collections import defaultdict

from sqlalchemy import Connection

from service.round.keys import ready_utc
from service.round.plans import ReleaseShape
from storage.readings import Reading, all_readings
from storage.ripe import point_ripe


def repoint(conn: Connection, stream_id: str, shape: ReleaseShape) -> None:
    """Choose each release's reading anew: the last one read by the final age, else the first after it."""
    by_key: dict[str, list[Reading]] = defaultdict(list)
    for reading in all_readings(conn, stream_id):
        if reading.count is not None:
            by_key[reading.key].append(reading)
    point_ripe(
        conn, stream_id, {key: chosen.id for key, read in by_key.items() if (chosen := _at_age(read, shape))}
    )


def _at_age(readings: list[Reading], shape: ReleaseShape) -> Reading | None:
    due = ready_utc(shape, readings[-1].at)
    by_then = [reading for reading in readings if reading.read_utc <= due]
    after = [reading for reading in readings if reading.read_utc > due]
    # Still young: it will be chosen when it is first read at its final age.
    return (by_then[-1] if by_then else after[0]) if after else None
