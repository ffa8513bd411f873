"""Shifts: what was announced, whether it may be told, and whether it was."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, fields
from datetime import datetime
from typing import Any

from sqlalchemy import Connection, Row, Select, select, update

from detectors.posterior import Quantiles
from storage.errors import NoSuchRow
from storage.tables import shifts
from storage.types import At
from storage.writes import change_one, insert_once

LIVE = "live"
HISTORY = "history"
EMERGING = "emerging"
SETTLED = "settled"
WITHDRAWN = "withdrawn"
_LEVELS = ("level_before", "level_after")
_ENDS = ("low", "mid", "high")


@dataclass(frozen=True, slots=True)
class Shift:
    """A shift. `origin` "history" is never told; `region` are the positions at which it may have begun."""

    id: str
    stream_id: str
    origin: str
    state: str
    announced_key: str
    announced_position: int
    announced_at: At
    announced_utc: datetime
    start_key: str
    start_position: int
    start_at: At
    region: tuple[int, ...]
    probability: float
    level_before: Quantiles
    level_after: Quantiles
    late: bool
    fingerprint: str
    reading_id: int | None
    told_utc: datetime | None = None
    told_how: str | None = None
    figures: Mapping[str, Any] = field(default_factory=dict)


def record_shift(conn: Connection, shift: Shift) -> bool:
    """Adds a shift; False, and nothing changed, when its id is there already."""
    return insert_once(conn, shifts, _values(shift))


def get_shift(conn: Connection, shift_id: str) -> Shift:
    """The shift with this id."""
    row = conn.execute(select(shifts).where(shifts.c.id == shift_id)).first()
    if row is None:
        raise NoSuchRow("shift", shift_id)
    return _shift(row)


def list_shifts(
    conn: Connection,
    *,
    stream_id: str | None = None,
    origin: str | None = None,
    state: str | None = None,
    limit: int = 100,
) -> tuple[Shift, ...]:
    """Shifts, the last announced first."""
    query = select(shifts)
    for column, wanted in (
        (shifts.c.stream_id, stream_id),
        (shifts.c.origin, origin),
        (shifts.c.state, state),
    ):
        if wanted is not None:
            query = query.where(column == wanted)
    newest_first = (shifts.c.announced_utc.desc(), shifts.c.announced_at.desc(), shifts.c.id)
    return _shifts(conn, query.order_by(*newest_first).limit(limit))


def untold_shifts(conn: Connection, *, limit: int = 1000) -> tuple[Shift, ...]:
    """Live shifts that nobody has been told of, the first announced first."""
    untold = select(shifts).where(shifts.c.told_utc.is_(None), shifts.c.origin == LIVE)
    return _shifts(conn, untold.order_by(shifts.c.announced_utc, shifts.c.id).limit(limit))


def mark_told(conn: Connection, shift_ids: Sequence[str], *, now: datetime, how: str) -> int:
    """Marks shifts as told, in the transaction that fills the outbox; gives how many were untold.

    `how` is a plain word for what was done: sent, hushed, no outlet.
    """
    untold = shifts.c.id.in_(shift_ids) & shifts.c.told_utc.is_(None)
    return conn.execute(update(shifts).where(untold).values(told_utc=now, told_how=how)).rowcount


def set_state(conn: Connection, shift_id: str, state: str) -> None:
    """Moves a shift on in its life."""
    change_one(conn, shifts, shift_id, {"state": state})


def overlapping_shifts(
    conn: Connection, stream_id: str, *, first_position: int, last_position: int
) -> tuple[Shift, ...]:
    """Shifts of the stream whose region meets these positions, in order of their start."""
    meets = (shifts.c.region_first <= last_position) & (shifts.c.region_last >= first_position)
    query = select(shifts).where(shifts.c.stream_id == stream_id, meets)
    return _shifts(conn, query.order_by(shifts.c.start_position, shifts.c.id))


def _values(shift: Shift) -> dict[str, Any]:
    region = (*map(int, shift.region), int(shift.start_position))
    values = {one.name: getattr(shift, one.name) for one in fields(Shift) if one.name not in _LEVELS}
    levels = {f"{name}_{end}": getattr(getattr(shift, name), end) for name in _LEVELS for end in _ENDS}
    changed = {
        "region": list(region[:-1]),
        "region_first": min(region),
        "region_last": max(region),
        "late": int(shift.late),
        "figures": dict(shift.figures),
    }
    return values | levels | changed


def _shift(row: Row[Any]) -> Shift:
    values = dict(row._mapping)
    for name in _LEVELS:
        values[name] = Quantiles(*(values.pop(f"{name}_{end}") for end in _ENDS))
    for name in ("region_first", "region_last"):
        del values[name]
    return Shift(**values | {"region": tuple(values["region"]), "late": bool(values["late"])})


def _shifts(conn: Connection, query: Select[Any]) -> tuple[Shift, ...]:
    return tuple(map(_shift, conn.execute(query)))
