"""Kill -9 before and after every commit of the path: nothing is lost, nothing but a delivery is repeated.

With KNICKPOINT_PROVE set, every commit is tried; without it a few.
"""

import datetime
import json
import os
import subprocess
import sys
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field, replace
from pathlib import Path

import pytest

import service
from storage.engine import open_store
from storage.outbox import list_deliveries
from storage.posteriors import history
from storage.readings import all_readings
from storage.rounds import list_rounds
from storage.shifts import list_shifts

ROOT = Path(service.__file__).parents[1]
STREAMS = ("plays/mill", "plays/quay")
WEEKS_POLLED = (17, 19, 21, 23, 24, 25)


@dataclass
class Walker:
    """The script, waiting for walks."""

    process: "subprocess.Popen[str]"
    source: str
    receiver: str
    secret: str

    def walk(
        self, database: Path, instants: list[str], commit: int = 0, side: str = "before"
    ) -> tuple[int, list[str]]:
        """Gives the exit status, and the stages whose commits it came to."""
        walk = {"database": str(database), "instants": instants, "commit": commit, "side": side}
        places = {"source": self.source, "receiver": self.receiver, "secret": self.secret}
        assert self.process.stdin is not None
        assert self.process.stdout is not None
        self.process.stdin.write(json.dumps(walk | places) + "\n")
        self.process.stdin.flush()
        ended = json.loads(self.process.stdout.readline())
        return ended["status"], ended["stages"]


@dataclass
class Ended:
    """What there is at the end of a walk."""

    readings: list[tuple[object, ...]] = field(default_factory=list)
    said: list[object] = field(default_factory=list)
    shifts: list[tuple[str, str, bool]] = field(default_factory=list)
    deliveries: list[tuple[str, str]] = field(default_factory=list)
    open_rounds: int = 0


@pytest.fixture
def walker(studio, desk, secret: str, counts_of: Callable[..., list[int]]) -> Iterator[Walker]:
    counts = {"quay": counts_of(1, (1000, 20), (300, 8)), "mill": counts_of(2, (40, 28))}
    studio.serve_by_instant(counts)
    command = [sys.executable, str(Path(__file__).with_name("walker.py"))]
    settings = os.environ | {"PYTHONPATH": str(ROOT), "OPENBLAS_NUM_THREADS": "1"}
    with subprocess.Popen(
        command,
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        stderr=subprocess.DEVNULL,
        text=True,
        env=settings,
    ) as process:
        yield Walker(process, studio.address, desk.address, secret)
        assert process.stdin is not None
        process.stdin.close()


def test_killed_at_any_commit(walker, studio, desk, tmp_path: Path, migrated_bytes: bytes) -> None:
    instants = [_instant(week) for week in WEEKS_POLLED]
    afterwards = [_instant(WEEKS_POLLED[-1], minutes) for minutes in (5, 10)]

    def fresh(name: str) -> Path:
        path = tmp_path / f"{name}.sqlite"
        path.write_bytes(migrated_bytes)
        desk.came.clear()
        studio.instants.clear()
        return path

    path = fresh("undisturbed")
    status, stages = walker.walk(path, instants + afterwards)
    assert status == 0
    expected, alerts = _ended(path), _by_id(desk.came)
    assert len(alerts) == 1
    assert [len(bodies) for bodies in alerts.values()] == [1]
    assert expected.readings == _served(studio)
    assert [origin for _, origin, _ in expected.shifts] == ["live"]
    tried = repeated = 0
    for commit, side in _kill_points(stages):
        path = fresh(f"{side} {commit}")
        status, come_to = walker.walk(path, instants + afterwards, commit, side)
        assert (status, come_to) == (-9, stages[:commit])
        tried += 1
        left = instants + afterwards
        begun = left.index(studio.instants[-1]) if studio.instants else 0
        assert walker.walk(path, left[begun:] + _later())[0] == 0
        got = _by_id(desk.came)
        assert got.keys() == alerts.keys(), (commit, side)
        assert all(body == bodies[0] for bodies in got.values() for body in bodies), (commit, side)
        assert _ended(path) == expected, (commit, side)
        repeated += sum(len(bodies) - 1 for bodies in got.values())
    assert desk.forged == 0
    print(f"{tried} kills survived; {repeated} deliveries repeated under their ids")
    # Between the receiver's answer and its record: it cannot be told from an answer that was lost.
    assert repeated >= 1


def _kill_points(stages: list[str]) -> Iterator[tuple[int, str]]:
    """Every commit; or those of the first reading and of its end, and all around the first telling."""
    tell = stages.index("tell")
    assert stages[tell - 1 : tell + 3] == ["fold", "tell", "attempt", "attempt"]
    few = (2, 3, tell - 3, *range(tell - 1, tell + 3))
    for place in range(len(stages)) if os.environ.get("KNICKPOINT_PROVE") else few:
        yield place + 1, "before"
        yield place + 1, "after"


def _instant(week: int, minutes: int = 0) -> str:
    monday = datetime.datetime(2025, 1, 6, 6, tzinfo=datetime.UTC)
    return (monday + datetime.timedelta(weeks=week + 1, minutes=minutes)).isoformat()


def _later() -> list[str]:
    """When what was being sent at the time of death is due again."""
    return [_instant(WEEKS_POLLED[-1], minutes) for minutes in (15, 20)]


def _served(studio) -> list[tuple[object, ...]]:
    rows = studio.rows_by(_instant(WEEKS_POLLED[-1]))
    return sorted((f"plays/{row['show']}", row["day"], row["plays"]) for row in rows)


def _by_id(came: list[tuple[str, dict[str, object]]]) -> dict[str, list[dict[str, object]]]:
    found: dict[str, list[dict[str, object]]] = {}
    for message, body in came:
        found.setdefault(message, []).append(body)
    return found


def _ended(path: Path) -> Ended:
    epoch = datetime.datetime(2000, 1, 1, tzinfo=datetime.UTC)
    with open_store(str(path)) as store, store.reading() as conn:
        return Ended(
            sorted(
                (one.stream_id, one.key, one.count) for name in STREAMS for one in all_readings(conn, name)
            ),
            [
                replace(row, id=0, reading_id=None, written_utc=epoch)
                for name in STREAMS
                for row in history(conn, name)
            ],
            [(one.id, one.origin, one.late) for one in list_shifts(conn)],
            [(one.id, one.state) for one in list_deliveries(conn)],
            sum(one.ended_utc is None for one in list_rounds(conn)),
        )
