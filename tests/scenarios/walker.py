"""Walks the path in a process of its own and kills itself at a commit. A script; run by test_killed.py.

Each line on standard input is a walk in JSON: the database, the addresses of source and receiver, the
instants to walk through, and at which commit to die, before or after it (0: never). Each walk is a forked
child, so that the packages are loaded only once. The answer is a line of JSON: the child's exit status, or
minus the signal, and the files in which the commits that it came to were asked for.
"""

import datetime
import json
import os
import random
import signal
import sys
import threading
import time
import traceback
from collections.abc import Callable
from pathlib import Path
from typing import Any
from zoneinfo import ZoneInfo

from detectors.judge import Rule
from detectors.model import Model
from service.deliver.loop import deliver_due
from service.outlets.signing import Signer
from service.outlets.webhook import Webhook
from service.round.calendar import Axis, Interval
from service.round.plans import CalendarShape, RoundPlan, StreamPlan
from service.sources.plans import FieldPlan, JsonPlan, WebPlace
from service.tell.tell import Taker
from service.work import Bench, pass_for
from storage.engine import Store, open_store
from storage.rounds import break_off_unfinished

UTC = ZoneInfo("UTC")
WEEKS = CalendarShape(Axis(Interval("week"), UTC), "missing")
RULE = Rule(threshold=0.9, window=40, lasting=4, fewest_counts=12)
MODEL = Model(dispersions=(4.0, 8.0, 16.0, 32.0, 64.0), wanders=((0.01, 1.0),))


class WalkClock:
    """Stands at the instant of the walk."""

    instant = datetime.datetime(2000, 1, 1, tzinfo=UTC)

    def now(self) -> datetime.datetime:
        return self.instant

    def monotonic(self) -> float:
        return time.monotonic()

    def real_seconds(self, duration: datetime.timedelta) -> float:
        return duration.total_seconds()


def main() -> None:
    for line in sys.stdin:
        told, telling = os.pipe()
        child = os.fork()
        if child == 0:
            walk(json.loads(line), telling)
            os._exit(0)
        os.close(telling)
        with os.fdopen(told) as pipe:
            stages = pipe.read().split()
        _, status = os.waitpid(child, 0)
        print(json.dumps({"status": os.waitstatus_to_exitcode(status), "stages": stages}), flush=True)


def walk(given: dict[str, Any], telling: int) -> None:
    clock = WalkClock()
    with open_store(given["database"], wait_seconds=5.0) as store:
        die_at(store, given["commit"], given["side"], telling)
        clock.instant = datetime.datetime.fromisoformat(given["instants"][0])
        with store.writing() as conn:
            break_off_unfinished(conn, now=clock.now())
        bench = Bench(store, clock, (Taker("desk"),), threading.Event())
        desk = Webhook("desk", given["receiver"], Signer(given["secret"]), time.monotonic)
        for instant in given["instants"]:
            clock.instant = datetime.datetime.fromisoformat(instant)
            pass_for(bench, plan_at(given["source"], instant))
            deliver_due(store, [desk], clock, random.Random(1).random)


def plan_at(address: str, instant: str) -> RoundPlan:
    """The source hears the instant in a header, and serves the weeks that were over by then."""
    place = WebPlace(address, (("x-instant", instant),))
    source = JsonPlan("plays", place, "$.data[*]", FieldPlan("$.day", "$.plays", split="$.show"), UTC)
    return RoundPlan("plays", source, datetime.timedelta(weeks=1), stream_for)


def stream_for(split: str | None) -> StreamPlan | None:
    return StreamPlan(f"plays/{split}", "plays", split, str(split), "house", WEEKS, MODEL, RULE, "one")


def die_at(store: Store, commit: int, side: str, telling: int) -> None:
    """Puts a counter around every commit of the writer."""
    dialect = store.engine.dialect
    real: Callable[[Any], None] = dialect.do_commit
    done, lock = [0], threading.Lock()

    def counted(connection: Any) -> None:
        with lock:
            done[0] += 1
            mine = done[0] == commit
            os.write(telling, f"{_stage()} ".encode())
        if mine and side == "before":
            os.kill(os.getpid(), signal.SIGKILL)
        real(connection)
        if mine and side == "after":
            os.kill(os.getpid(), signal.SIGKILL)

    dialect.do_commit = counted  # type: ignore[method-assign]


def _stage() -> str:
    """The file of the service that asked for the commit under way."""
    frames = traceback.extract_stack()
    return next((Path(one.filename).stem for one in reversed(frames) if "service" in one.filename), "walker")


if __name__ == "__main__":
    main()
