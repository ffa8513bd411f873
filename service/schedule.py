"""When each source is read. The only file that imports APScheduler."""

import datetime
import threading
from collections.abc import Callable
from concurrent import futures
from dataclasses import dataclass

from apscheduler.executors.pool import ThreadPoolExecutor  # type: ignore[import-untyped]
from apscheduler.schedulers.background import BackgroundScheduler  # type: ignore[import-untyped]
from apscheduler.triggers.interval import IntervalTrigger  # type: ignore[import-untyped]

from service.logs import log

MOST_AT_ONCE = 4
JITTER_SHARE = 0.05
LONGEST_JITTER_SECONDS = 60.0

Action = Callable[[], None]


@dataclass(frozen=True, slots=True)
class Job:
    """Something done again and again: every so many seconds of real time, for the first time after `wait`."""

    name: str
    action: Action
    every_seconds: float
    wait_seconds: float


class Schedule:
    """Runs jobs on a few threads; one job never runs twice at once, and missed runs become one."""

    def __init__(self) -> None:
        self._scheduler = BackgroundScheduler(
            timezone=datetime.UTC,
            executors={"default": ThreadPoolExecutor(MOST_AT_ONCE)},
            # By default a run late by over one second would be skipped.
            job_defaults={"misfire_grace_time": None, "coalesce": True, "max_instances": 1},
        )
        # Not jobs of the scheduler: its thread dies of one that is done in the moment in which it is stopped.
        self._once: list[Action] = []
        self._pool_of_once = futures.ThreadPoolExecutor(MOST_AT_ONCE, "once")
        self._running = 0
        self._change = threading.Condition()

    def add(self, job: Job) -> None:
        """Plan a job. A little jitter keeps many sources from being asked in the same second."""
        jitter = min(job.every_seconds * JITTER_SHARE, LONGEST_JITTER_SECONDS)
        first = datetime.datetime.now(datetime.UTC) + datetime.timedelta(seconds=job.wait_seconds)
        trigger = IntervalTrigger(
            seconds=job.every_seconds,  # Fractions of a second work, for the demo.
            start_date=first,
            timezone=datetime.UTC,
            jitter=jitter if jitter >= 1.0 else None,
        )
        self._scheduler.add_job(
            self._counted(job.action), trigger, id=job.name, name=job.name, next_run_time=first
        )

    def add_once(self, action: Action) -> None:
        """Plan something to be done once, as soon as there is a thread for it."""
        self._once.append(self._counted(action))

    def start(self) -> None:
        """Begin."""
        for action in self._once:
            self._pool_of_once.submit(action)
        self._scheduler.start()

    def stop(self, within_seconds: float) -> bool:
        """Plan nothing further and wait for what is under way; whether all of it ended within the bound."""
        self._pool_of_once.shutdown(wait=False, cancel_futures=True)
        if self._scheduler.running:
            self._scheduler.shutdown(wait=False)
        with self._change:
            return self._change.wait_for(lambda: self._running == 0, timeout=within_seconds)

    def _counted(self, action: Action) -> Action:
        """The action, counted while it runs; whatever it raises is logged, not lost."""

        def counted() -> None:
            self._count(1)
            try:
                action()
            except Exception:  # What is planned must go on being done; the line says what went wrong.
                log.exception("pass failed")
            finally:
                self._count(-1)

        return counted

    def _count(self, step: int) -> None:
        with self._change:
            self._running += step
            self._change.notify_all()
