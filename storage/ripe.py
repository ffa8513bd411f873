"""Which reading of a key held when it was first read at its final age. It stays, whatever is read later."""

from collections.abc import Mapping, Sequence

from sqlalchemy import Connection, delete, insert, select

from storage.readings import Reading, readings_of
from storage.tables import newest, readings, ripe


def note_ripe(conn: Connection, stream_id: str, keys: Sequence[str]) -> int:
    """Keeps the newest reading of each of these keys as the ripe one, unless it has one; gives how many."""
    known = set(conn.scalars(select(ripe.c.key).where(ripe.c.stream_id == stream_id)))
    fresh = set(keys) - known
    if not fresh:
        return 0
    query = select(newest.c.key, newest.c.reading_id).where(newest.c.stream_id == stream_id)
    rows = [
        {"stream_id": stream_id, "key": key, "reading_id": reading_id}
        for key, reading_id in conn.execute(query)
        if key in fresh
    ]
    if rows:
        conn.execute(insert(ripe), rows)
    return len(rows)


def point_ripe(conn: Connection, stream_id: str, chosen: Mapping[str, int]) -> None:
    """Replaces all of a stream's ripe readings."""
    conn.execute(delete(ripe).where(ripe.c.stream_id == stream_id))
    rows = [{"stream_id": stream_id, "key": key, "reading_id": one} for key, one in chosen.items()]
    if rows:
        conn.execute(insert(ripe), rows)


def ripe_readings(conn: Connection, stream_id: str) -> tuple[Reading, ...]:
    """The ripe reading of every key that has one."""
    query = (
        select(readings).join(ripe, ripe.c.reading_id == readings.c.id).where(ripe.c.stream_id == stream_id)
    )
    return readings_of(conn, query)
