"""The daemon: rounds on a schedule, deliveries beside them, and a clean end within a bound."""

import logging
import os
import random
import signal
import threading
from collections.abc import Callable
from pathlib import Path

from service.clock import Clock, SystemClock
from service.deliver.loop import Tools
from service.deliver.workers import Deliverer
from service.good_rounds import report_good_round
from service.logs import configure, log
from service.round.plans import RoundPlan
from service.schedule import Job, Schedule
from service.wiring import Wired, wire
from service.work import Bench, catch_up, pass_for
from storage.engine import Store, open_store
from storage.migrate import upgrade
from storage.rounds import BROKEN_OFF, break_off_unfinished, list_rounds


def run(settings: Path) -> None:
    """Watch the sources until SIGTERM or Ctrl-C."""
    stop = threading.Event()
    for number in (signal.SIGTERM, signal.SIGINT):
        signal.signal(number, lambda *_: stop.set())
    wired = wire(settings, os.environ)
    configure(wired.log_form, wired.log_level)
    if not watch(wired, SystemClock(), stop):
        # A thread cannot be stopped, and Python would wait for it. Every commit is whole, so leaving is safe.
        logging.shutdown()
        os._exit(0)


def watch(wired: Wired, clock: Clock, stop: threading.Event) -> bool:
    """Watch the sources until the event is set. Takes up whatever an earlier process left undone.

    Gives whether everything that was under way ended within the bound; what did not is done again by the next
    process.
    """
    with open_store(wired.database) as store:
        _begin(store, wired, clock)
        deliverer = Deliverer(Tools(store, clock, random.random), wired.outlets)
        schedule = _schedule(Bench(store, clock, wired.takers, stop), wired, deliverer)
        deliverer.start()
        schedule.start()
        stop.wait()
        log.info("stopping", within_seconds=wired.stop_within_seconds)
        ends = clock.monotonic() + wired.stop_within_seconds
        rounds_ended = schedule.stop(wired.stop_within_seconds)
        sent = deliverer.stop(max(ends - clock.monotonic(), 0.0))
    if rounds_ended and sent:
        log.info("stopped")
    else:
        log.warning("stopped with work under way", rounds_ended=rounds_ended, deliveries_ended=sent)
    return rounds_ended and sent


def _begin(store: Store, wired: Wired, clock: Clock) -> None:
    upgraded = upgrade(store)
    with store.writing() as conn:
        broken_off = break_off_unfinished(conn, now=clock.now())
    log.info(
        "started",
        database=store.place,
        schema=upgraded.after,
        sources=len(wired.rounds),
        outlets=len(wired.outlets),
        rounds_broken_off=broken_off,
    )


def _schedule(bench: Bench, wired: Wired, deliverer: Deliverer) -> Schedule:
    """Every source's rounds, and at the start what an earlier process read but did not fold or tell."""
    schedule = Schedule()
    for plan in wired.rounds:
        one_at_a_time = threading.Lock()
        backlog = _backlog(bench, plan, deliverer, one_at_a_time)
        schedule.add_once(backlog)
        action = _one_pass(bench, plan, wired.good_rounds, deliverer, one_at_a_time)
        every = bench.clock.real_seconds(plan.every)
        schedule.add(Job(plan.name, action, every, _wait_seconds(bench.store, plan, bench.clock)))
    return schedule


def _backlog(bench: Bench, plan: RoundPlan, deliverer: Deliverer, mine: threading.Lock) -> Callable[[], None]:
    def backlog() -> None:
        with mine:
            if not bench.stop.is_set():
                catch_up(bench, plan)
                deliverer.wake()

    return backlog


def _one_pass(
    bench: Bench, plan: RoundPlan, good_rounds: str | None, deliverer: Deliverer, mine: threading.Lock
) -> Callable[[], None]:
    def one_pass() -> None:
        with mine:
            if bench.stop.is_set():
                return
            passed = pass_for(bench, plan)
            deliverer.wake()
        if passed.good and good_rounds is not None:
            report_good_round(good_rounds, plan.name, bench.clock.monotonic)

    return one_pass


def _wait_seconds(store: Store, plan: RoundPlan, clock: Clock) -> float:
    """Real seconds to a source's first round: none when one is overdue, as after downtime or a crash.

    Never longer than between two rounds, even if the last one seems to lie ahead: clocks are put right.
    """
    with store.reading() as conn:
        last = list_rounds(conn, source=plan.name, limit=1)
    if not last or last[0].outcome == BROKEN_OFF:
        return 0.0
    wait = last[0].started_utc + plan.every - clock.now()
    return max(clock.real_seconds(min(wait, plan.every)), 0.0)
