"""Checkpoints: where to take up folding again. A correction far back needs an old one, so a few stay."""

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import Connection, delete, insert, or_, select

from storage.errors import NoSuchRow
from storage.tables import checkpoints

# Besides the newest, one is kept that lies 1 to 3 observations back, one 4 to 15, one 16 to 63, one 64 to 255
# and one 256 or more. In each class the oldest stays, and grows into the next; in the last, the youngest.
_CLASS_STARTS = (1, 4, 16, 64, 256)
KEPT_AT_MOST = 1 + len(_CLASS_STARTS)


@dataclass(frozen=True, slots=True)
class CheckpointMark:
    """A checkpoint without its bytes: number of observations folded, and the digest of just those."""

    id: int
    folded: int
    digest: str
    fingerprint: str
    written_utc: datetime


def keep_checkpoint(
    conn: Connection,
    stream_id: str,
    *,
    folded: int,
    resumed_from: int,
    digest: str,
    fingerprint: str,
    body: bytes,
    now: datetime,
) -> None:
    """Keeps it as the newest of a fold that took up after `resumed_from` observations (0: from the start).

    Those further on than that rest on observations that have changed, and go, as do those of other
    fingerprints; the rest is thinned.
    """
    mine = checkpoints.c.stream_id == stream_id
    beyond = or_(checkpoints.c.folded > resumed_from, checkpoints.c.folded >= folded)
    conn.execute(delete(checkpoints).where(mine, or_(checkpoints.c.fingerprint != fingerprint, beyond)))
    row = {"folded": folded, "digest": digest, "fingerprint": fingerprint, "body": body, "written_utc": now}
    conn.execute(insert(checkpoints).values(stream_id=stream_id, **row))
    stored = conn.scalars(select(checkpoints.c.folded).where(mine)).all()
    dropped = set(stored) - set(worth_keeping(stored))
    conn.execute(delete(checkpoints).where(mine, checkpoints.c.folded.in_(dropped)))


def worth_keeping(folded: Sequence[int]) -> tuple[int, ...]:
    """Of the checkpoints after so many observations, those that stay, newest first."""
    newest = max(folded)
    ends = (*_CLASS_STARTS[1:], newest + 1)
    classes = [
        [one for one in folded if start <= newest - one < end]
        for start, end in zip(_CLASS_STARTS, ends, strict=True)
    ]
    stay = [min(ages) for ages in classes[:-1] if ages] + [max(ages) for ages in classes[-1:] if ages]
    return (newest, *stay)


def list_checkpoints(conn: Connection, stream_id: str, *, fingerprint: str) -> tuple[CheckpointMark, ...]:
    """The checkpoints made under this fingerprint, the one furthest on first."""
    columns = [checkpoints.c[name] for name in ("id", "folded", "digest", "fingerprint", "written_utc")]
    mine = (checkpoints.c.stream_id == stream_id) & (checkpoints.c.fingerprint == fingerprint)
    rows = conn.execute(select(*columns).where(mine).order_by(checkpoints.c.folded.desc()))
    return tuple(CheckpointMark(*row) for row in rows)


def checkpoint_bytes(conn: Connection, checkpoint_id: int) -> bytes:
    """The bytes of a checkpoint."""
    body = conn.scalar(select(checkpoints.c.body).where(checkpoints.c.id == checkpoint_id))
    if body is None:
        raise NoSuchRow("checkpoint", checkpoint_id)
    return bytes(body)


def drop_checkpoints(conn: Connection, stream_id: str) -> int:
    """The next fold begins at the first observation; gives the number dropped."""
    return conn.execute(delete(checkpoints).where(checkpoints.c.stream_id == stream_id)).rowcount
