"""Readings: numbers as a source gave them, with the time they were read. Never overwritten."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from typing import Any

from sqlalchemy import Connection, Select, bindparam, func, insert, select, update

from storage.errors import HeadMoved, KeyTwice
from storage.tables import newest, readings, streams
from storage.types import At, at_text, clean_text, real, whole
from storage.writes import insert_new


@dataclass(frozen=True, slots=True)
class NewReading:
    """What a source says of one key now.

    `final` says that the key is past its final age: of such a key at most one reading a UTC day is kept,
    unless its count falls, goes missing or comes back.
    """

    key: str
    at: At
    count: int | None
    title: str | None = None
    exposure: float | None = None
    final: bool = False


@dataclass(frozen=True, slots=True)
class Reading:
    """A reading as it is kept."""

    id: int
    stream_id: str
    key: str
    at: At
    title: str | None
    count: int | None
    exposure: float | None
    read_utc: datetime
    round_id: int | None


@dataclass(frozen=True, slots=True)
class Kept:
    """What became of the rows of one stream; `held` are final ones that had their reading of the day.

    `absent` are keys that are stored but were not among the rows; `newest_id` is 0 when none is stored.
    """

    stored: int
    unchanged: int
    held: int
    absent: int
    newest_id: int


@dataclass(frozen=True, slots=True)
class Head:
    """The newest reading (0: none) and the epoch of a stream: what a fold of it rests on."""

    reading_id: int
    epoch: int


def keep_readings(
    conn: Connection,
    stream_id: str,
    rows: Sequence[NewReading],
    *,
    now: datetime,
    round_id: int | None = None,
) -> Kept:
    """Stores the rows that differ from the newest reading of their key."""
    given = _by_key(stream_id, rows)
    stored = {reading.key: reading for reading in _newest(conn, stream_id)}
    changed = [row for key, row in given.items() if key not in stored or _differs(row, stored[key])]
    due = [row for row in changed if row.key not in stored or not _held(row, stored[row.key], now)]
    ids = _insert(conn, stream_id, due, now, round_id)
    _point_to_newest(conn, stream_id, ids, stored)
    return Kept(
        stored=len(due),
        unchanged=len(given) - len(changed),
        held=len(changed) - len(due),
        absent=len(stored.keys() - given.keys()),
        newest_id=max([*ids.values(), *(reading.id for reading in stored.values())], default=0),
    )


def newest_readings(conn: Connection, stream_id: str) -> tuple[Reading, ...]:
    """The newest reading of every key, in order of time and key."""
    return tuple(sorted(_newest(conn, stream_id), key=lambda reading: (at_text(reading.at), reading.key)))


def key_readings(conn: Connection, stream_id: str, key: str) -> tuple[Reading, ...]:
    """All readings of one key, oldest first."""
    query = select(readings).where(readings.c.stream_id == stream_id, readings.c.key == key)
    return readings_of(conn, query.order_by(readings.c.id))


def all_readings(conn: Connection, stream_id: str) -> tuple[Reading, ...]:
    """All readings of a stream, key by key, oldest first within a key."""
    query = select(readings).where(readings.c.stream_id == stream_id)
    return readings_of(conn, query.order_by(readings.c.key, readings.c.id))


def newest_at(conn: Connection, source: str) -> At | None:
    """How far the source reaches: the latest day or instant of any stored key of its streams."""
    query = (
        select(func.max(readings.c.at))
        .select_from(streams)
        .join(newest, newest.c.stream_id == streams.c.id)
        .join(readings, readings.c.id == newest.c.reading_id)
        .where(streams.c.source == source)
    )
    reaches: At | None = conn.scalar(query)
    return reaches


def readings_of(conn: Connection, query: Select[Any]) -> tuple[Reading, ...]:
    """The readings that a query for whole rows finds."""
    return tuple(Reading(**row._mapping) for row in conn.execute(query))


def head(conn: Connection, stream_id: str) -> Head:
    """Where the stream stands."""
    query = (
        select(streams.c.epoch, func.coalesce(func.max(newest.c.reading_id), 0))
        .select_from(streams.outerjoin(newest, newest.c.stream_id == streams.c.id))
        .where(streams.c.id == stream_id)
        .group_by(streams.c.epoch)
    )
    row = conn.execute(query).first()
    return Head(0, 0) if row is None else Head(row[1], row[0])


def require_head(conn: Connection, stream_id: str, expected: Head) -> None:
    """Raises `HeadMoved` unless the stream still stands where it stood when it was read."""
    found = head(conn, stream_id)
    if found != expected:
        raise HeadMoved(stream_id, expected, found)


def _by_key(stream_id: str, rows: Sequence[NewReading]) -> dict[str, NewReading]:
    given: dict[str, NewReading] = {}
    for row in map(_plain, rows):
        if given.setdefault(row.key, row) != row:
            raise KeyTwice(stream_id, row.key)
    return given


def _plain(row: NewReading) -> NewReading:
    # In the form in which it will be read back, so that an unchanged row never looks changed.
    return replace(
        row,
        at=row.at.astimezone(UTC) if isinstance(row.at, datetime) else row.at,
        count=None if row.count is None else whole(row.count),
        title=None if row.title is None else clean_text(row.title),
        exposure=None if row.exposure is None else real(row.exposure),
    )


def _differs(row: NewReading, stored: Reading) -> bool:
    return (row.count, row.exposure, row.title, row.at) != (
        stored.count,
        stored.exposure,
        stored.title,
        stored.at,
    )


def _held(row: NewReading, stored: Reading, now: datetime) -> bool:
    same_day = stored.read_utc.date() == now.astimezone(UTC).date()
    return row.final and same_day and not _falls(stored.count, row.count)


def _falls(before: int | None, now: int | None) -> bool:
    if before is None or now is None:
        return before is not now
    return now < before


def _insert(
    conn: Connection, stream_id: str, rows: Sequence[NewReading], now: datetime, round_id: int | None
) -> dict[str, int]:
    if not rows:
        return {}
    values = [_values(row) | {"stream_id": stream_id, "read_utc": now, "round_id": round_id} for row in rows]
    done = conn.execute(insert(readings).returning(readings.c.key, readings.c.id), values)
    return {row.key: row.id for row in done}


def _values(row: NewReading) -> dict[str, Any]:
    return {
        "key": row.key,
        "at": row.at,
        "count": row.count,
        "title": row.title,
        "exposure": row.exposure,
    }


def _point_to_newest(
    conn: Connection, stream_id: str, ids: Mapping[str, int], stored: Mapping[str, Reading]
) -> None:
    fresh = [
        {"stream_id": stream_id, "key": key, "reading_id": id} for key, id in ids.items() if key not in stored
    ]
    insert_new(conn, newest, fresh)
    moved = [{"moved_key": key, "moved_id": id} for key, id in ids.items() if key in stored]
    if moved:
        mine = (newest.c.stream_id == stream_id) & (newest.c.key == bindparam("moved_key"))
        conn.execute(update(newest).where(mine).values(reading_id=bindparam("moved_id")), moved)


def _newest(conn: Connection, stream_id: str) -> list[Reading]:
    query = select(readings).join(newest, newest.c.reading_id == readings.c.id)
    return list(readings_of(conn, query.where(newest.c.stream_id == stream_id)))
