"""One pass over the outbox: everything that is due, each outlet for itself."""

import threading
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from datetime import timedelta

from service.clock import Clock
from service.deliver.attempt import GIVEN_UP, Report, attempt, claim_next, put_off
from service.deliver.backoff import Chance
from service.deliver.log_lines import log_report
from service.outlets.outlet import Kind, Outlet
from storage.engine import Store
from storage.outbox import due_deliveries, give_up

MOST_IN_A_PASS = 200
MOST_AT_ONCE = 32
MOST_STRAYS = 1000
STRAYS_GIVEN_UP_AFTER = timedelta(days=5)

Watcher = Callable[[Report], None]


@dataclass(frozen=True, slots=True)
class Counts:
    """What a pass did: deliveries that arrived, that are due again later, that are given up."""

    delivered: int = 0
    put_off: int = 0
    given_up: int = 0

    def __add__(self, other: "Counts") -> "Counts":
        return Counts(
            self.delivered + other.delivered,
            self.put_off + other.put_off,
            self.given_up + other.given_up,
        )


@dataclass(frozen=True, slots=True)
class Tools:
    """What delivering needs besides the outlets. `watcher` hears of every attempt, on the outlet's thread."""

    store: Store
    clock: Clock
    chance: Chance
    watcher: Watcher = log_report


def deliver_due(store: Store, outlets: Sequence[Outlet], clock: Clock, chance: Chance) -> Counts:
    """One pass over all outlets at once, to its end."""
    return deliver_all(Tools(store, clock, chance), outlets, threading.Event())


def deliver_all(tools: Tools, outlets: Sequence[Outlet], stop: threading.Event) -> Counts:
    """One pass over all outlets at once; ends when the slowest has tried all that was due.

    When `stop` is set, attempts under way end (each within its outlet's `attempt_seconds`) and none begins.
    """
    strays = Counts(given_up=give_up_strays(tools, [outlet.name for outlet in outlets]))
    if not outlets:
        return strays
    with ThreadPoolExecutor(min(len(outlets), MOST_AT_ONCE), "deliver") as pool:
        passes = [pool.submit(deliver_outlet, tools, outlet, stop) for outlet in outlets]
    return sum((each.result() for each in passes), strays)


def deliver_outlet(tools: Tools, outlet: Outlet, stop: threading.Event) -> Counts:
    """Try what is due at one outlet, each delivery once, at most `MOST_IN_A_PASS`.

    A receiver that says when to come back is left alone until then, with all its deliveries.
    """
    due_by, counts = tools.clock.now(), Counts()
    for _ in range(MOST_IN_A_PASS):
        delivery = None if stop.is_set() else claim_next(tools.store, outlet, tools.clock, due_by)
        if delivery is None:
            break
        report = attempt(tools.store, outlet, delivery, tools.clock, tools.chance)
        tools.watcher(report)
        counts += _counted(report)
        if report.hold_seconds:
            put_off(tools.store, outlet, tools.clock, due_by, report.hold_seconds)
            break
    return counts


def give_up_strays(tools: Tools, known: Sequence[str]) -> int:
    """Give up what has long been due at outlets that are no longer in the settings; gives how many."""
    due_by = tools.clock.now() - STRAYS_GIVEN_UP_AFTER
    with tools.store.reading() as conn:
        overdue = due_deliveries(conn, now=due_by, limit=MOST_STRAYS)
    strays = [delivery for delivery in overdue if delivery.outlet not in known]
    if strays:
        with tools.store.writing() as conn:
            for stray in strays:
                give_up(conn, stray.id, why=_stray_sentence(stray.outlet))
    return len(strays)


def _stray_sentence(outlet: str) -> str:
    days = STRAYS_GIVEN_UP_AFTER.days
    return (
        f'Outlet "{outlet}" has not been in the settings for {days} days. Put it back and send this delivery '
        "again, or leave it."
    )


def _counted(report: Report) -> Counts:
    if report.outcome == Kind.DELIVERED:
        return Counts(delivered=1)
    if report.outcome == GIVEN_UP:
        return Counts(given_up=1)
    return Counts(put_off=1)
