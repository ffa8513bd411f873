"""When each source is read. The only file that imports APScheduler."""

import datetime
from collections.abc import Callable
from dataclasses import dataclass

from apscheduler.executors.pool import ThreadPoolExecutor
from apscheduler.schedulers.background import BackgroundScheduler
from apscheduler.triggers.interval import IntervalTrigger

MOST_AT_ONCE = 4
JITTER_SHARE = 0.05
LONGEST_JITTER_SECONDS = 60.0


@dataclass(frozen=True, slots=True)
class Job:
    """Something done again and again: every so many seconds of real time, for the first time after `wait`."""

    name: str
    action: Callable[[], None]
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

    def add(self, job: Job) -> None:
        """Plan a job. A little jitter keeps many sources from being asked in the same second."""
        jitter = min(job.every_seconds * JITTER_SHARE, LONGEST_JITTER_SECONDS)
        first = datetime.datetime.now(datetime.UTC) + datetime.timedelta(seconds=job.wait_seconds)
        trigger = IntervalTrigger(
            seconds=job.every_seconds,  # type: ignore[arg-type]  # Fractions of a second work, for the demo.
            start_date=first,
            timezone=datetime.UTC,
            jitter=jitter if jitter >= 1.0 else None,  # type: ignore[arg-type]
        )
        self._scheduler.add_job(job.action, trigger, id=job.name, name=job.name, next_run_time=first)

    def start(self) -> None:
        """Begin."""
        self._scheduler.start()

    def stop(self) -> None:
        """Plan nothing further; what runs is left to end by itself (see the daemon's bound)."""
        if self._scheduler.running:
            self._scheduler.shutdown(wait=False)
