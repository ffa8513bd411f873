"""Which reading of a release counts: the one that held when it was first read at its final age."""

import dataclasses
import datetime
from collections import defaultdict
from collections.abc import Iterable, Sequence

from sqlalchemy import Connection

from service.round.keys import ready_utc
from service.round.plans import ReleaseShape, StreamPlan
from storage.readings import Kept, NewReading, Reading, all_readings, keep_readings, newest_readings
from storage.ripe import note_ripe, point_ripe, ripe_readings
from storage.streams import find_stream


def keep_releases(
    conn: Connection,
    stream_id: str,
    shape: ReleaseShape,
    rows: Sequence[NewReading],
    *,
    now: datetime.datetime,
    round_id: int,
) -> Kept:
    """Store rows of releases, and note which of them were read at their final age now for the first time.

    The count at the final age is stored even where another of the same day would hold it back. A release
    whose date was moved is chosen anew: what held at its former age no longer counts.
    """
    dates = {one.key: one.at for one in newest_readings(conn, stream_id)}
    ripe = {one.key for one in ripe_readings(conn, stream_id)}
    given = [dataclasses.replace(row, final=row.final and row.key in ripe) for row in rows]
    kept = keep_readings(conn, stream_id, given, now=now, round_id=round_id)
    if any(dates.get(row.key, row.at) != row.at for row in rows):
        repoint(conn, stream_id, shape, seen_utc=now)
    note_ripe(conn, stream_id, [row.key for row in rows if row.final and row.count is not None])
    return kept


def came_to_age(conn: Connection, streams: Iterable[StreamPlan], now: datetime.datetime) -> bool:
    """Whether a release came to its final age since its source was last read as a whole.

    Then the document must be read again, unchanged or not: only it says which releases it still holds.
    """
    known = [(stream, find_stream(conn, stream.id)) for stream in streams]
    last = max((stored.last_seen_utc for _, stored in known if stored is not None), default=now)
    return any(
        last < ready_utc(stream.shape, one.at) <= now
        for stream, stored in known
        if stored is not None and isinstance(stream.shape, ReleaseShape)
        for one in newest_readings(conn, stream.id)
    )


def repoint(conn: Connection, stream_id: str, shape: ReleaseShape, *, seen_utc: datetime.datetime) -> None:
    """Choose each release's reading anew, after the final age or the date of a release has changed.

    A choice that still can be right stays. Else it is the last count that was read by the final age, else the
    first one after it. `seen_utc` is when the stream was last read: a release that was younger then waits.
    """
    pointed = {one.key: one.id for one in ripe_readings(conn, stream_id)}
    by_key: dict[str, list[Reading]] = defaultdict(list)
    for reading in all_readings(conn, stream_id):
        by_key[reading.key].append(reading)
    chosen = {}
    for key, read in by_key.items():
        due = ready_utc(shape, read[-1].at)
        possible = _around(read, due) if due <= seen_utc else []
        if possible:
            chosen[key] = pointed[key] if pointed.get(key) in possible else possible[0]
    point_ripe(conn, stream_id, chosen)


def _around(read: Sequence[Reading], due: datetime.datetime) -> list[int]:
    """The readings that can have held when the release was first read at its final age."""
    counted = [one for one in read if one.count is not None]
    by_then = [one.id for one in counted if one.read_utc <= due]
    after = [one.id for one in counted if one.read_utc > due]
    return by_then[-1:] + after[:1]
