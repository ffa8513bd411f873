"""One pass over the outbox: everything that is due, each outlet for itself."""

import threading
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

from service.clock import Clock
from service.deliver.attempt import GIVEN_UP, Report, attempt, claim_next, put_off
from service.deliver.backoff import Chance
from service.deliver.log_lines import log_report, log_strays
from service.outlets.outlet import Kind, Outlet
from storage.engine import Store
from storage.outbox import WAITING, list_deliveries

MOST_IN_A_PASS = 200
MOST_AT_ONCE = 32
MOST_STRAYS = 1000

Watcher = Callable[[Report], None]


@dataclass(frozen=True, slots=True)
class Counts:
    """What a pass did: deliveries that arrived, that are due again later, that are given up.

    `strays` wait for outlets that are no longer in the settings, until these come back.
    """

    delivered: int = 0
    put_off: int = 0
    given_up: int = 0
    strays: int = 0

    def __add__(self, other: "Counts") -> "Counts":
        return Counts(
            self.delivered + other.delivered,
            self.put_off + other.put_off,
            self.given_up + other.given_up,
            self.strays + other.strays,
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
    strays = Counts(strays=count_strays(tools.store, [outlet.name for outlet in outlets]))
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


def count_strays(store: Store, known: Sequence[str]) -> int:
    """How many deliveries wait for outlets that are not in the settings; a log line names these outlets.

    They are kept: an outlet may be missing by mistake, or have another name for a while.
    """
    with store.reading() as conn:
        waiting = list_deliveries(conn, state=WAITING, limit=MOST_STRAYS)
    strays = [delivery.outlet for delivery in waiting if delivery.outlet not in known]
    if strays:
        log_strays(sorted(set(strays)), len(strays))
    return len(strays)


def _counted(report: Report) -> Counts:
    if report.outcome == Kind.DELIVERED:
        return Counts(delivered=1)
    if report.outcome == GIVEN_UP:
        return Counts(given_up=1)
    return Counts(put_off=1)
