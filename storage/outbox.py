"""The outbox: what is to be sent where, and every attempt at it. Id and body never change here."""

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from datetime import datetime
from typing import Any

from sqlalchemy import Connection, Row, Select, func, insert, select, update

from storage.errors import NoSuchRow
from storage.tables import attempts, deliveries
from storage.writes import change_one, insert_once

WAITING = "waiting"
DELIVERED = "delivered"
GIVEN_UP = "given_up"


@dataclass(frozen=True, slots=True)
class NewDelivery:
    """A message for one outlet; its id stays the same however often it is sent."""

    id: str
    outlet: str
    shift_id: str | None
    body: bytes
    created_utc: datetime
    due_utc: datetime


@dataclass(frozen=True, slots=True)
class Delivery:
    """A message as it stands; `attempts` counts since it was last set waiting by hand."""

    id: str
    outlet: str
    shift_id: str | None
    body: bytes
    created_utc: datetime
    due_utc: datetime
    state: str
    attempts: int
    last_status: int | None
    last_error: str | None


@dataclass(frozen=True, slots=True)
class Attempt:
    """One try to deliver. `outcome` is a plain word; `status` the HTTP status, where there was one."""

    at_utc: datetime
    outcome: str
    status: int | None
    error: str | None
    took_seconds: float


def add_delivery(conn: Connection, delivery: NewDelivery) -> bool:
    """Puts a message into the outbox; False, and nothing changed, when its id is there already."""
    return insert_once(conn, deliveries, asdict(delivery) | {"state": WAITING, "attempts": 0})


def due_deliveries(
    conn: Connection, *, now: datetime, outlet: str | None = None, limit: int = 100
) -> tuple[Delivery, ...]:
    """Messages whose time has come, the longest due first."""
    due = _of_outlet(_waiting(), outlet).where(deliveries.c.due_utc <= now)
    return _deliveries(conn, due.order_by(deliveries.c.due_utc, deliveries.c.id).limit(limit))


def claim_due(
    conn: Connection, *, now: datetime, until: datetime, outlet: str | None = None, limit: int = 100
) -> tuple[Delivery, ...]:
    """Due messages, put off until the given instant, so that no other sender takes them meanwhile."""
    claimed = due_deliveries(conn, now=now, outlet=outlet, limit=limit)
    mine = deliveries.c.id.in_([delivery.id for delivery in claimed])
    conn.execute(update(deliveries).where(mine).values(due_utc=until))
    return claimed


def record_success(conn: Connection, delivery_id: str, attempt: Attempt) -> None:
    """The message has arrived."""
    _record(conn, delivery_id, attempt, {"state": DELIVERED})


def record_failure(conn: Connection, delivery_id: str, attempt: Attempt, *, due_utc: datetime) -> None:
    """It has not arrived, and is due again later."""
    _record(conn, delivery_id, attempt, {"due_utc": due_utc})


def record_last_failure(conn: Connection, delivery_id: str, attempt: Attempt) -> None:
    """It has not arrived, and nobody tries again."""
    _record(conn, delivery_id, attempt, {"state": GIVEN_UP})


def give_up(conn: Connection, delivery_id: str, *, why: str) -> None:
    """Nobody tries again, for a reason other than an attempt."""
    change_one(conn, deliveries, delivery_id, {"state": GIVEN_UP, "last_error": why})


def send_again(conn: Connection, delivery_id: str, *, now: datetime) -> None:
    """Sets a message waiting anew, due at once, under its id."""
    change_one(conn, deliveries, delivery_id, {"state": WAITING, "due_utc": now, "attempts": 0})


def get_delivery(conn: Connection, delivery_id: str) -> Delivery:
    """The message with this id."""
    found = _deliveries(conn, select(deliveries).where(deliveries.c.id == delivery_id))
    if not found:
        raise NoSuchRow("delivery", delivery_id)
    return found[0]


def list_deliveries(
    conn: Connection,
    *,
    state: str | None = None,
    outlet: str | None = None,
    shift_id: str | None = None,
    limit: int = 100,
) -> tuple[Delivery, ...]:
    """Messages, the newest first."""
    query = _of_outlet(select(deliveries), outlet)
    if state is not None:
        query = query.where(deliveries.c.state == state)
    if shift_id is not None:
        query = query.where(deliveries.c.shift_id == shift_id)
    newest_first = (deliveries.c.created_utc.desc(), deliveries.c.id)
    return _deliveries(conn, query.order_by(*newest_first).limit(limit))


def list_attempts(conn: Connection, delivery_id: str) -> tuple[Attempt, ...]:
    """All attempts at a message, the first first."""
    names = ("at_utc", "outcome", "status", "error", "took_seconds")
    query = select(*(attempts.c[name] for name in names)).where(attempts.c.delivery_id == delivery_id)
    return tuple(Attempt(*row) for row in conn.execute(query.order_by(attempts.c.id)))


def count_waiting(conn: Connection, *, outlet: str | None = None) -> int:
    """How many messages wait, due or not."""
    query = select(func.count()).select_from(deliveries).where(deliveries.c.state == WAITING)
    return conn.scalar(_of_outlet(query, outlet)) or 0


def next_due(conn: Connection, *, outlet: str | None = None) -> datetime | None:
    """When the next message is due; None when none waits."""
    query = select(deliveries.c.due_utc).where(deliveries.c.state == WAITING)
    due: datetime | None = conn.scalar(_of_outlet(query, outlet).order_by(deliveries.c.due_utc).limit(1))
    return due


def _record(conn: Connection, delivery_id: str, attempt: Attempt, changes: Mapping[str, Any]) -> None:
    last = {"last_status": attempt.status, "last_error": attempt.error, "attempts": deliveries.c.attempts + 1}
    change_one(conn, deliveries, delivery_id, {**last, **changes})
    conn.execute(insert(attempts).values(delivery_id=delivery_id, **asdict(attempt)))


def _waiting() -> Select[Any]:
    return select(deliveries).where(deliveries.c.state == WAITING)


def _of_outlet(query: Select[Any], outlet: str | None) -> Select[Any]:
    return query if outlet is None else query.where(deliveries.c.outlet == outlet)


def _deliveries(conn: Connection, query: Select[Any]) -> tuple[Delivery, ...]:
    return tuple(map(_delivery, conn.execute(query)))


def _delivery(row: Row[Any]) -> Delivery:
    return Delivery(**row._mapping)
