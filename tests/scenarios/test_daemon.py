"""The daemon: watching on a fast clock, taking up what was left undone, and ending when it is told to."""

import datetime
import json
import os
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path
from zoneinfo import ZoneInfo

import pytest

import service
from service.clock import Clock, FastClock
from service.daemon import watch
from service.wiring import Wired
from storage.engine import open_store
from storage.outbox import list_deliveries
from storage.readings import newest_readings
from storage.rounds import BROKEN_OFF, GOOD, begin_round, list_rounds
from storage.shifts import LIVE, list_shifts

ROOT = Path(service.__file__).parents[1]
WEEK = datetime.timedelta(weeks=1)
PATIENCE_SECONDS = 30.0

SETTINGS = """
[service]
database = "house.sqlite"
log_form = "json"
stop_within = "{stop_within}"

[[source]]
name = "plays"
kind = "json"
address = {{ env = "PLAYS_ADDRESS" }}
rows = "$.data[*]"
every = "1h"

  [source.fields]
  at = "$.day"
  count = "$.plays"
  split = "$.show"

  [source.streams]
  shape = "calendar"
  interval = "week"
  absent = "missing"

[[outlet]]
name = "desk"
kind = "webhook"
address = {{ env = "DESK_ADDRESS" }}
secret = {{ env = "DESK_SECRET" }}
"""


@pytest.fixture
def wired(world) -> Wired:
    return Wired(
        database=world.store.place,
        zone=ZoneInfo("UTC"),
        rounds=(world.plan(),),
        outlets=(world.outlet(),),
        takers=world.bench().takers,
        good_rounds=None,
        stop_within_seconds=10.0,
        log_form="json",
        log_level="info",
    )


@contextmanager
def watching(wired: Wired, clock: Clock) -> Iterator[list[bool]]:
    """A daemon in a thread; afterwards the list holds whether it ended within its bound."""
    stop, ended = threading.Event(), list[bool]()
    thread = threading.Thread(target=lambda: ended.append(watch(wired, clock, stop)))
    thread.start()
    try:
        yield ended
    finally:
        stop.set()
        thread.join(PATIENCE_SECONDS)
        assert not thread.is_alive()


def test_a_fast_clock_sees_a_fall_and_tells_it(world, wired: Wired, counts_of) -> None:
    world.studio.serve_by_instant({"quay": counts_of(1, (1000, 50), (400, 60))})
    begins = datetime.datetime(2025, 9, 30, 6, tzinfo=datetime.UTC)
    clock = FastClock(begins, WEEK.total_seconds() / 0.25)
    world.studio.now = lambda: clock.now().isoformat()
    with watching(wired, clock) as ended:
        assert world.desk.arrived.wait(PATIENCE_SECONDS)
    assert ended == [True]
    ((_, alert),) = world.desk.came
    assert alert["stream"]["id"] == "plays/quay"
    with world.store.reading() as conn:
        rounds, deliveries = list_rounds(conn), list_deliveries(conn)
    assert all(one.ended_utc is not None for one in rounds)
    assert len(rounds) > 1
    assert len(deliveries) == 1


def test_what_was_read_but_not_folded_is_taken_up_at_once(world, wired: Wired, counts_of) -> None:
    counts = counts_of(1, (1000, 40), (400, 4))
    world.studio.weekly("quay", counts[:40])
    world.at_week(39)
    world.poll()
    world.at_week(43)
    world.studio.weekly("quay", counts)
    world.stop.set()  # Ends between reading and folding.
    world.read()
    world.stop.clear()
    assert world.shifts() == ()
    asked = len(world.studio.asked)
    # The next round is due in a week; the alert does not wait for it.
    with watching(wired, world.clock):
        assert world.desk.arrived.wait(PATIENCE_SECONDS)
    assert len(world.studio.asked) == asked
    assert [shift.origin for shift in world.shifts()] == [LIVE]


def test_a_round_that_was_broken_off_is_begun_again_at_once(world, wired: Wired, counts_of) -> None:
    world.studio.weekly("quay", counts_of(1, (1000, 14)))
    world.at_week(13)
    with world.store.writing() as conn:
        begin_round(conn, "plays", now=world.clock.now())
    with watching(wired, world.clock):
        _until(lambda: len(world.history()) == 14)
    with world.store.reading() as conn:
        assert [one.outcome for one in list_rounds(conn)] == [GOOD, BROKEN_OFF]


def test_good_rounds_are_reported_and_failed_ones_are_not(world, wired: Wired, counts_of, loopback) -> None:
    sign = type(world.studio)()
    sign.address = loopback(sign)
    wired = replace(wired, good_rounds=sign.address)
    world.studio.broken = (500, b"")
    with watching(wired, world.clock):
        _until(lambda: len(world.studio.asked) == 1)
    assert sign.asked == []
    world.studio.broken = None
    world.studio.weekly("quay", counts_of(1, (1000, 3)))
    world.clock.instant += 2 * WEEK
    with watching(wired, world.clock):
        _until(lambda: sign.asked == [200])


@pytest.fixture
def start(tmp_path: Path, studio, desk, secret: str) -> Callable[..., "subprocess.Popen[str]"]:
    def start_one(stop_within: str) -> "subprocess.Popen[str]":
        settings = tmp_path / "house.toml"
        settings.write_text(SETTINGS.format(stop_within=stop_within), encoding="utf-8")
        command = [sys.executable, "-m", "service.cli.main", "run", "--settings", str(settings)]
        places = {"PLAYS_ADDRESS": studio.address, "DESK_ADDRESS": desk.address, "DESK_SECRET": secret}
        return subprocess.Popen(command, cwd=ROOT, env=os.environ | places, stderr=subprocess.PIPE, text=True)

    return start_one


def test_a_real_process_ends_on_sigterm(start, studio, desk, counts_of, tmp_path: Path, secret: str) -> None:
    studio.weekly("quay", counts_of(1, (1000, 14)))
    with start("20s") as process:
        lines = _read_until(process, "round ended")
        process.send_signal(signal.SIGTERM)
        _, rest = process.communicate(timeout=PATIENCE_SECONDS)
    assert process.returncode == 0
    facts = [json.loads(line) for line in (*lines, *rest.splitlines())]
    events = [one["event"] for one in facts]
    assert events[0] == "started"
    assert events[-1] == "stopped"
    (ended,) = (one for one in facts if one["event"] == "round ended")
    assert (ended["source"], ended["outcome"]) == ("plays", "good")
    everything = "".join(lines) + rest
    assert not [one for one in (studio.address, desk.address, secret) if one in everything]
    with open_store(str(tmp_path / "house.sqlite")) as store, store.reading() as conn:
        assert len(newest_readings(conn, "plays/quay")) == 14


def test_a_source_that_hangs_does_not_keep_the_process(start, studio, counts_of, tmp_path: Path) -> None:
    studio.weekly("quay", counts_of(1, (1000, 14)))
    studio.drip_seconds = 0.2
    with start("1s") as process:
        lines = _read_until(process, "started")
        assert studio.reached.wait(PATIENCE_SECONDS)
        began = time.monotonic()
        process.send_signal(signal.SIGTERM)
        _, rest = process.communicate(timeout=PATIENCE_SECONDS)
        took = time.monotonic() - began
    studio.drip_seconds = 0.0
    assert process.returncode == 0
    assert took < 10.0
    assert len(lines) == 1
    assert json.loads(rest.splitlines()[-1])["event"] == "stopped with work under way"
    with open_store(str(tmp_path / "house.sqlite")) as store, store.reading() as conn:
        assert list_shifts(conn) == ()
        assert [one.outcome for one in list_rounds(conn)] == ["under way"]


def _read_until(process: "subprocess.Popen[str]", event: str) -> list[str]:
    assert process.stderr is not None
    lines = []
    for line in process.stderr:
        lines.append(line)
        if json.loads(line)["event"] == event:
            break
    return lines


def _until(done: Callable[[], bool]) -> None:
    ends = time.monotonic() + PATIENCE_SECONDS
    while not done():
        assert time.monotonic() < ends
        time.sleep(0.02)
