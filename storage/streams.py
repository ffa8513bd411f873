"""Streams: what is known of each, since when it is read, and its epoch."""

from collections.abc import Sequence
from dataclasses import asdict, dataclass
from datetime import datetime

from sqlalchemy import Connection, Row, select

from storage.errors import NoSuchRow
from storage.tables import streams
from storage.writes import change_one, insert_new


@dataclass(frozen=True, slots=True)
class SeenStream:
    """A stream as a round met it. `shape` is "calendar" or "release"."""

    id: str
    source: str
    split: str | None
    title: str
    slate: str | None
    shape: str


@dataclass(frozen=True, slots=True)
class Stream:
    """A stream as it is kept. `first_read_utc` is the instant of its first round; a new epoch voids folds."""

    id: str
    source: str
    split: str | None
    title: str
    slate: str | None
    shape: str
    first_read_utc: datetime
    last_seen_utc: datetime
    epoch: int
    fingerprint: str | None
    hushed_until_utc: datetime | None


def see_streams(conn: Connection, seen: Sequence[SeenStream], *, now: datetime) -> tuple[str, ...]:
    """Notes the streams of a round; gives the ids that were not known before, in the order seen."""
    known = set(conn.scalars(select(streams.c.id)))
    rows = {stream.id: asdict(stream) | {"last_seen_utc": now} for stream in seen}
    new = tuple(id for id in rows if id not in known)
    insert_new(conn, streams, [rows[id] | {"first_read_utc": now, "epoch": 0} for id in new])
    for id in rows.keys() & known:
        change_one(conn, streams, id, rows[id])
    return new


def find_stream(conn: Connection, stream_id: str) -> Stream | None:
    """The stream with this id, or None."""
    row = conn.execute(select(streams).where(streams.c.id == stream_id)).first()
    return None if row is None else _stream(row)


def get_stream(conn: Connection, stream_id: str) -> Stream:
    """The stream with this id."""
    stream = find_stream(conn, stream_id)
    if stream is None:
        raise NoSuchRow("stream", stream_id)
    return stream


def list_streams(
    conn: Connection, *, source: str | None = None, slate: str | None = None
) -> tuple[Stream, ...]:
    """All streams, or those of one source or slate, by title."""
    query = select(streams).order_by(streams.c.title, streams.c.id)
    if source is not None:
        query = query.where(streams.c.source == source)
    if slate is not None:
        query = query.where(streams.c.slate == slate)
    return tuple(map(_stream, conn.execute(query)))


def hush_stream(conn: Connection, stream_id: str, until: datetime | None) -> None:
    """Alerts of the stream are recorded but not sent until the instant; None lifts the hush."""
    change_one(conn, streams, stream_id, {"hushed_until_utc": until})


def bump_epoch(conn: Connection, stream_id: str) -> int:
    """Begins a new epoch: whoever is folding the stream must start again. Gives the new epoch."""
    epoch = get_stream(conn, stream_id).epoch + 1
    change_one(conn, streams, stream_id, {"epoch": epoch})
    return epoch


def set_fingerprint(conn: Connection, stream_id: str, fingerprint: str) -> None:
    """Notes the settings and model version by which the stream was last folded."""
    change_one(conn, streams, stream_id, {"fingerprint": fingerprint})


def _stream(row: Row[tuple[object, ...]]) -> Stream:
    return Stream(**row._mapping)
