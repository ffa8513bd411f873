"""The daemon: rounds on a schedule, deliveries beside them, and a clean end within a bound."""

import os
import random
import signal
import threading
from collections.abc import Callable
from pathlib import Path

from service.clock import Clock, SystemClock
from service.deliver.attempt import Report
from service.deliver.loop import Tools
from service.deliver.workers import Deliverer
from service.good_rounds import report_good_round
from service.logs import configure, log
from service.round.plans import RoundPlan
from service.schedule import Job, Schedule
from service.wiring import Wired, wire
from service.work import Bench, pass_for
from storage.engine import Store, open_store
from storage.migrate import upgrade
from storage.rounds import FAILED, break_off_unfinished, list_rounds



def run(settings: Path) -> None:
    """Watch the sources until SIGTERM or Ctrl-C."""
    stop = threading.Event()
    for number in (signal.SIGTERM, signal.SIGINT):
        signal.signal(number, lambda *_: stop.set())
    wired = wire(settings, os.environ)
    configure(wired.log_form, wired.log_level)
    watch(wired, SystemClock(), stop)


def watch(wired: Wired, clock: Clock, stop: threading.Event) -> None:
    """Watch the sources until the event is set. Takes up whatever an earlier process left undone."""
    with open_store(wired.database) as store:
        upgraded = upgrade(store)
        with store.writing() as conn:
            broken = break_off_unfinished(conn, now=clock.now())
        log.info("started", database=store.place, schema=upgraded.after, sources=len(wired.rounds), broken=broken)
        bench = Bench(store, clock, wired.takers, stop)
        deliverer = Deliverer(_tools(store, clock), wired.outlets, _trouble)
        schedule = Schedule()
        busy = threading.Semaphore(len(wired.rounds) or 1)
        for plan in wired.rounds:
            action = _action(bench, plan, wired, deliverer)
            every = clock.real_seconds(plan.every)
            schedule.add(Job(plan.name, _counted(busy, action), every, _wait_seconds(store, plan, clock)))
        deliverer.start()
        schedule.start()
        stop.wait()
        log.info("stopping", within_seconds=wired.stop_within_seconds)
        ends = clock.monotonic() + wired.stop_within_seconds
        schedule.stop()
        _wait_for(busy, len(wired.rounds), clock, ends)
        deliverer.stop(max(ends - clock.monotonic(), 0.0))
    log.info("stopped")


def _action(bench: Bench, plan: RoundPlan, wired: Wired, deliverer: Deliverer) -> Callable[[], None]:
    def one_pass() -> None:
        if bench.stop.is_set():
            return
        outcome = pass_for(bench, plan)
        deliverer.wake()
        if outcome.outcome != FAILED and wired.good_rounds is not None:
            report_good_round(wired.good_rounds, plan.name, bench.clock.monotonic)

    return one_pass


def _counted(busy: threading.Semaphore, action: Callable[[], None]) -> Callable[[], None]:
    """The action, so that the end can wait for those under way; whatever it raises is logged, not lost."""

    def counted() -> None:
        with busy:
            try:
                action()
            except Exception:
                log.exception("pass failed")

    return counted


def _wait_for(busy: threading.Semaphore, jobs: int, clock: Clock, ends: float) -> None:
    for _ in range(jobs):
        if not busy.acquire(timeout=max(ends - clock.monotonic(), 0.0)):
            log.warning("a round is still under way; what it has not recorded will be done again")
            return


def _wait_seconds(store: Store, plan: RoundPlan, clock: Clock) -> float:
    """Real seconds to a source's first round: none when one is overdue, as after downtime."""
    with store.reading() as conn:
        last = list_rounds(conn, source=plan.name, limit=1)
    if not last:
        return 0.0
    return max(clock.real_seconds(last[0].started_utc + plan.every - clock.now()), 0.0)


def _tools(store: Store, clock: Clock) -> Tools:
    return Tools(store, clock, random.random, _heard)


def _heard(report: Report) -> None:
    facts = {"delivery": report.delivery_id, "outlet": report.outlet, "shift": report.shift_id}
    log.info("delivery", outcome=report.outcome, status=report.status, error=report.error, **facts)


def _trouble(outlet: str, error: Exception) -> None:
    log.error("delivering failed", outlet=outlet, kind=type(error).__name__)


