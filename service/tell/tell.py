"""Tell: untold shifts become messages in the outbox, slate by slate.

Writing a slate's messages and marking its shifts as told is one transaction: a crash before it tells nothing,
a crash after it has told everything, and a second teller finds nothing left to do. A shift that no outlet
takes is marked too, so that an outlet that is added next year does not begin with last year's alerts; the
table of shifts keeps it, and how it was told.
"""

import datetime
import hashlib
from collections.abc import Sequence
from dataclasses import dataclass

from sqlalchemy import Connection

from service.clock import Clock
from service.logs import log
from service.tell.alert_body import EMERGING_TYPE, alert_body
from service.tell.gather import Untold, gather, story_of
from storage.engine import Store
from storage.outbox import NewDelivery, add_delivery
from storage.shifts import get_shift, mark_told

SENT = "sent"
HUSHED = "hushed"
NO_OUTLET = "no outlet"
MOST_PASSES = 200


@dataclass(frozen=True, slots=True)
class Taker:
    """An outlet, and the slates whose alerts it takes: None for all, streams without a slate included."""

    outlet: str
    slates: frozenset[str] | None = None

    def takes(self, slate: str | None) -> bool:
        """Whether alerts of this slate go to the outlet."""
        return self.slates is None or slate in self.slates


@dataclass(frozen=True, slots=True)
class Telling:
    """How one shift is told: the messages that are written for it, if any."""

    untold: Untold
    how: str
    deliveries: tuple[NewDelivery, ...]


def tell_due(store: Store, takers: Sequence[Taker], clock: Clock) -> int:
    """Tell every untold shift; gives how many were dealt with, those that nobody is sent included."""
    told = 0
    for _ in range(MOST_PASSES):
        with store.reading() as conn:
            slates = gather(conn)
        done = sum(_tell_slate(store, untold, takers, clock) for untold in slates.values())
        if not done:
            break
        told += done
    return told


def delivery_id(outlet: str, shift_id: str, kind: str) -> str:
    """A stable id: the same message to the same outlet has the same, however often it is composed."""
    text = f"{kind}\n{shift_id}\n{outlet}"
    return "msg_" + hashlib.sha256(text.encode("utf-8", "surrogatepass")).hexdigest()[:24]


def _tell_slate(store: Store, untold: Sequence[Untold], takers: Sequence[Taker], clock: Clock) -> int:
    now = clock.now()
    tellings = [_telling(one, takers, now) for one in untold]
    with store.writing() as conn:
        written = [telling for telling in tellings if _write(conn, telling, now)]
    for telling in written:
        _log(telling)
    return len(written)


def _telling(untold: Untold, takers: Sequence[Taker], now: datetime.datetime) -> Telling:
    hushed_until = untold.stream.hushed_until_utc
    if hushed_until is not None and hushed_until > now:
        return Telling(untold, HUSHED, ())
    outlets = [taker.outlet for taker in takers if taker.takes(untold.stream.slate)]
    deliveries = tuple(_delivery(untold, outlet, now) for outlet in outlets)
    return Telling(untold, SENT if deliveries else NO_OUTLET, deliveries)


def _delivery(untold: Untold, outlet: str, now: datetime.datetime) -> NewDelivery:
    message = delivery_id(outlet, untold.shift.id, EMERGING_TYPE)
    body = alert_body(story_of(untold), message, now)
    return NewDelivery(message, outlet, untold.shift.id, body, created_utc=now, due_utc=now)


def _write(conn: Connection, telling: Telling, now: datetime.datetime) -> bool:
    """False if somebody else has told it since it was read."""
    shift_id = telling.untold.shift.id
    if get_shift(conn, shift_id).told_utc is not None:
        return False
    for delivery in telling.deliveries:
        add_delivery(conn, delivery)
    return mark_told(conn, [shift_id], now=now, how=telling.how) == 1


def _log(telling: Telling) -> None:
    shift, stream = telling.untold.shift, telling.untold.stream
    facts = {"shift": shift.id, "stream": stream.id, "slate": stream.slate}
    if telling.how == HUSHED:
        log.info("shift not sent, its stream is hushed", until=stream.hushed_until_utc, **facts)
    elif telling.how == NO_OUTLET:
        log.warning("shift not sent, no outlet takes its slate", **facts)
    else:
        log.info("shift told", outlets=", ".join(one.outlet for one in telling.deliveries), **facts)
