"""Posteriors: what was said after each observation. A re-fold supersedes rows and keeps them as evidence."""

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy import ColumnElement, Connection, Row, and_, delete, insert, select, update

from detectors.posterior import Posterior, Quantiles
from storage.codec import decode_history, encode_history
from storage.tables import posteriors, streams
from storage.types import At


@dataclass(frozen=True, slots=True)
class NewPosterior:
    """The posterior after the observation at a place (0-based), and what it rests on."""

    place: int
    key: str
    at: At
    count: int | None
    posterior: Posterior
    fingerprint: str
    reading_id: int | None


@dataclass(frozen=True, slots=True)
class StoredPosterior:
    """A posterior as it is kept; `history` are the bytes of its distributions (see `as_posterior`)."""

    id: int
    stream_id: str
    place: int
    key: str
    at: At
    count: int | None
    position: int
    counted: int
    recent_shift: float
    run_length_mode: int
    level: Quantiles
    one_off: float
    log_predictive: float
    pit: tuple[float, float]
    history: bytes
    fingerprint: str
    reading_id: int | None
    written_utc: datetime
    superseded_utc: datetime | None


def write_posteriors(
    conn: Connection, stream_id: str, rows: Sequence[NewPosterior], *, now: datetime
) -> None:
    """Adds posteriors at places that hold none, or whose rows were superseded."""
    if rows:
        conn.execute(insert(posteriors), [_values(stream_id, row, now) for row in rows])


def supersede_from(conn: Connection, stream_id: str, place: int, *, now: datetime) -> int:
    """Turns the current rows from this place on into evidence; gives their number."""
    later = and_(_current(stream_id), posteriors.c.place >= place)
    return conn.execute(update(posteriors).where(later).values(superseded_utc=now)).rowcount


def history(
    conn: Connection,
    stream_id: str,
    *,
    since: At | None = None,
    until: At | None = None,
    limit: int | None = None,
) -> tuple[StoredPosterior, ...]:
    """The current rows in order, `since` included and `until` not; with a limit, so many of the newest."""
    query = select(posteriors).where(_current(stream_id))
    if since is not None:
        query = query.where(posteriors.c.at >= since)
    if until is not None:
        query = query.where(posteriors.c.at < until)
    newest_first = conn.execute(query.order_by(posteriors.c.place.desc()).limit(limit)).all()
    return tuple(_stored(row) for row in reversed(newest_first))


def newest_posterior(conn: Connection, stream_id: str) -> StoredPosterior | None:
    """The current row of the last place."""
    found = history(conn, stream_id, limit=1)
    return found[0] if found else None


def newest_posteriors(conn: Connection) -> dict[str, StoredPosterior]:
    """The current row of the last place of every stream that has one."""
    # One look into the index for each stream: a grouped query would go through all rows.
    found = {id: newest_posterior(conn, id) for id in conn.scalars(select(streams.c.id)).all()}
    return {id: row for id, row in found.items() if row is not None}


def evidence(conn: Connection, stream_id: str, place: int) -> tuple[StoredPosterior, ...]:
    """All that was ever said at a place: the current row, if any, then the superseded, newest first."""
    here = and_(posteriors.c.stream_id == stream_id, posteriors.c.place == place)
    # Two questions rather than one, because each of the two has its index.
    current = select(posteriors).where(here, posteriors.c.superseded_utc.is_(None))
    older = select(posteriors).where(here, posteriors.c.superseded_utc.is_not(None))
    rows = [*conn.execute(current), *conn.execute(older.order_by(posteriors.c.id.desc()))]
    return tuple(map(_stored, rows))


def prune_superseded(conn: Connection, *, before: datetime) -> int:
    """Deletes evidence superseded before the instant; gives the number of rows."""
    return conn.execute(delete(posteriors).where(posteriors.c.superseded_utc < before)).rowcount


def as_posterior(stored: StoredPosterior) -> Posterior:
    """The posterior in full; its probabilities are as exact as `storage.codec` keeps them."""
    decoded = decode_history(stored.history)
    return Posterior(
        position=stored.position,
        counted=stored.counted,
        run_lengths=decoded.run_lengths,
        run_length_mode=stored.run_length_mode,
        recent_shift=stored.recent_shift,
        level=stored.level,
        dispersion=decoded.dispersion,
        wander=decoded.wander,
        one_off=stored.one_off,
        log_predictive=stored.log_predictive,
        pit=stored.pit,
    )


def _current(stream_id: str) -> ColumnElement[bool]:
    return and_(posteriors.c.stream_id == stream_id, posteriors.c.superseded_utc.is_(None))


def _values(stream_id: str, row: NewPosterior, now: datetime) -> dict[str, Any]:
    return {
        "stream_id": stream_id,
        "place": row.place,
        "key": row.key,
        "at": row.at,
        "count": row.count,
        "fingerprint": row.fingerprint,
        "reading_id": row.reading_id,
        "written_utc": now,
        **_figures(row.posterior),
    }


def _figures(posterior: Posterior) -> dict[str, Any]:
    return {
        "position": posterior.position,
        "counted": posterior.counted,
        "recent_shift": posterior.recent_shift,
        "run_length_mode": posterior.run_length_mode,
        "level_low": posterior.level.low,
        "level_mid": posterior.level.mid,
        "level_high": posterior.level.high,
        "one_off": posterior.one_off,
        "log_predictive": posterior.log_predictive,
        "pit_low": posterior.pit[0],
        "pit_high": posterior.pit[1],
        "history": encode_history(posterior.run_lengths, posterior.dispersion, posterior.wander),
    }


def _stored(row: Row[Any]) -> StoredPosterior:
    values = dict(row._mapping)
    level = Quantiles(*(values.pop(f"level_{end}") for end in ("low", "mid", "high")))
    pit = (values.pop("pit_low"), values.pop("pit_high"))
    return StoredPosterior(**values, level=level, pit=pit)
