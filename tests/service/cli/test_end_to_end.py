"""The command line on a folder of its own: an invented show whose counts fall, from file to receiver."""

import json
import os
import signal
import subprocess
import sys
import time
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from datetime import time as clock_time
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import Table, update
from standardwebhooks import Webhook as ReferenceVerifier

import service
from service.cli.main import run_command
from service.exit_codes import Exit
from storage.engine import open_existing_store
from storage.tables import rounds, streams

SECRET = "whsec_MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSw"
STREAM = "plays/Low Tide"
BEFORE, AFTER = 40, 12
COUNTS = [1000, 940, 1075, 1010, 985] * (BEFORE // 5) + [400, 385, 420, 410] * (AFTER // 4)
FIRST = datetime.now(UTC).date() - timedelta(days=len(COUNTS))
FELL = str(FIRST + timedelta(days=BEFORE))
SETTINGS = """
[service]
database = "store.sqlite"
stop_within = "10s"

[model]
wanders = [[0.0, 1]]
dispersions = [16, 64]

[[source]]
name = "plays"
kind = "csv"
path = "plays.csv"
every = "1h"

[source.fields]
at = "day"
count = "plays"
split = "show"

[source.streams]
shape = "calendar"
interval = "day"
absent = "missing"

[[outlet]]
name = "desk"
kind = "webhook"
address = { env = "DESK_ADDRESS" }
secret = { env = "DESK_SECRET" }
"""


@dataclass(frozen=True)
class House:
    """The folder, and the command line in it."""

    folder: Path
    capsys: pytest.CaptureFixture[str]

    def settle(self, text: str) -> None:
        (self.folder / "knickpoint.toml").write_text(text, encoding="utf-8")

    def serve(self, days: int) -> None:
        lines = [f"{FIRST + timedelta(days=day)},Low Tide,{COUNTS[day]}" for day in range(days)]
        text = "\n".join(["day,show,plays", *lines, f"{FIRST},Old Show,-1"])
        (self.folder / "plays.csv").write_text(text + "\n", encoding="utf-8")

    def run(self, *arguments: str) -> tuple[int, str, str]:
        code = run_command([*arguments, "--settings", str(self.folder / "knickpoint.toml")])
        shown = self.capsys.readouterr()
        return code, shown.out, shown.err

    def ask(self, *arguments: str) -> Any:
        code, out, err = self.run(*arguments, "--json")
        assert code == Exit.GOOD, err
        return json.loads(out)

    def pretend(self, table: Table, **values: datetime) -> None:
        """As if that had been at another time, which cannot be waited for here."""
        with open_existing_store(str(self.folder / "store.sqlite")) as store, store.writing() as conn:
            conn.execute(update(table).values(**values))

    def poll_before_the_fall(self) -> None:
        """So that the fall is live: what is served next is newer than the stream's first poll."""
        self.serve(BEFORE)
        assert self.run("poll")[0] == Exit.GOOD
        self.pretend(streams, first_read_utc=_noon(FIRST + timedelta(days=BEFORE - 1)))
        self.serve(len(COUNTS))

    def stands(self) -> str | None:
        (stream,) = self.ask("streams")
        word: str | None = stream["stands"]
        return word


@pytest.fixture
def house(tmp_path: Path, capsys: pytest.CaptureFixture[str], receiver, monkeypatch) -> House:
    monkeypatch.setenv("DESK_ADDRESS", receiver.address)
    monkeypatch.setenv("DESK_SECRET", SECRET)
    monkeypatch.chdir(tmp_path)
    made = House(tmp_path, capsys)
    made.settle(SETTINGS)
    return made


def _noon(day: date) -> datetime:
    return datetime.combine(day, clock_time(12), UTC)


def _verified(post) -> Any:
    return ReferenceVerifier(SECRET).verify(post.body, post.headers)


def _figures(line: dict[str, Any]) -> dict[str, Any]:
    return {name: value for name, value in line.items() if name not in ("written", "replaced")}


def test_from_a_file_to_the_receiver(house: House, receiver) -> None:
    house.poll_before_the_fall()
    assert receiver.received == []
    code, out, _ = house.run("poll")
    assert (code, "knickpoint rounds 2" in out) == (Exit.GOOD, True)
    (got,) = receiver.received
    alert = _verified(got)
    assert (alert["stream"]["id"], alert["figures"]["start"]["key"]) == (STREAM, FELL)

    (stream,) = house.ask("streams")
    assert (stream["id"], stream["counts"]) == (STREAM, len(COUNTS))
    (shift,) = house.ask("shifts")
    assert (shift["origin"], shift["told_how"], shift["start"]["key"]) == ("live", "sent", FELL)
    assert alert["sentence"] in house.run("shifts")[1]
    (delivery,) = house.ask("deliveries")
    assert (delivery["id"], delivery["state"], delivery["body"]) == (alert["id"], "delivered", alert)


def test_the_stored_run_length_history_says_since_when(house: House) -> None:
    house.serve(len(COUNTS))
    house.ask("poll")
    last = house.ask("history", STREAM)["history"][-1]
    best = max(last["run_lengths"], key=lambda group: group["probability"])
    assert (best["shortest"], best["longest"], best["first_run"]) == (AFTER, AFTER, False)
    _, out, _ = house.run("history", STREAM)
    assert out.rstrip().splitlines()[-1].split()[-3:-1] == [str(AFTER), FELL]
    _, out, _ = house.run("history", STREAM, "--until", FELL, "--limit", "1")
    assert f"before {FIRST}" in out.splitlines()[-1]


def test_tables_of_days_fit_an_ordinary_terminal(house: House) -> None:
    house.poll_before_the_fall()
    house.ask("poll")
    for arguments in (("streams",), ("shifts",), ("history", STREAM), ("deliveries",), ("rounds",)):
        # Lines of a table have more than one space somewhere; prose, which is wrapped there, has not.
        table = [line for line in house.run(*arguments)[1].splitlines() if "  " in line]
        assert len(table) > 1
        assert max(map(len, table)) <= 80, arguments


def test_rebuilding_says_the_same_again_and_tells_nobody(house: House, receiver) -> None:
    house.serve(len(COUNTS))
    house.ask("poll")
    before = house.ask("history", STREAM)["history"]
    assert house.ask("rebuild") == [{"stream_id": STREAM, "folded": len(COUNTS), "new_shifts": 0}]
    after = house.ask("history", STREAM)["history"]
    assert [_figures(line) for line in after] == [_figures(line) for line in before]
    both = house.ask("history", STREAM, "--superseded", "--limit", "1")["history"]
    assert both == house.ask("history", STREAM, "--place", str(len(COUNTS) - 1))["history"]
    assert [line["replaced"] is None for line in both] == [True, False]
    assert "replaced" in house.run("history", STREAM, "--superseded", "--limit", "1")[1]
    assert receiver.received == []
    assert house.run("rebuild", "plays/Nothing")[0] == Exit.NOT_FOUND


def test_a_shift_found_in_history_is_shown_and_never_told(house: House, receiver) -> None:
    house.serve(len(COUNTS))
    house.ask("poll")
    (shift,) = house.ask("shifts")
    assert (shift["origin"], shift["told"], shift["told_how"]) == ("found in history", None, None)
    assert "found in history" in house.run("shifts")[1]
    assert receiver.received == []


def test_what_an_outlet_refused_for_good_can_be_sent_again(house: House, receiver, answer) -> None:
    house.poll_before_the_fall()
    receiver.will(answer(410))
    _, _, err = house.run("poll")
    assert "desk" in err
    (delivery,) = house.ask("deliveries", "--state", "given-up")
    assert f"{delivery['id']} is given up" in house.run("deliveries")[1]
    house.ask("send-again", delivery["id"])
    house.ask("poll")
    first, second = receiver.received
    assert (first.body, first.headers["webhook-id"]) == (second.body, second.headers["webhook-id"])
    assert house.ask("deliveries")[0]["state"] == "delivered"


def test_a_hushed_stream_is_recorded_and_not_sent(house: House, receiver) -> None:
    house.poll_before_the_fall()
    house.ask("hush", STREAM, "--until", "2999-01-01")
    house.ask("poll")
    assert [shift["told_how"] for shift in house.ask("shifts")] == ["hushed"]
    assert receiver.received == []
    assert "hushed until" in house.run("streams")[1]


def test_looking_needs_no_secret_and_polling_does(house: House, monkeypatch) -> None:
    house.serve(BEFORE)
    house.ask("poll")
    monkeypatch.delenv("DESK_SECRET")
    looking = [("streams",), ("history", STREAM), ("shifts",), ("rounds",), ("deliveries",), ("migrate",)]
    assert [house.run(*arguments)[0] for arguments in looking] == [Exit.GOOD] * len(looking)
    assert house.run("hush", STREAM, "--until", "2999-01-01")[0] == Exit.GOOD
    for arguments in (("poll",), ("check",), ("try-outlet", "desk"), ("try-source", "plays")):
        code, _, err = house.run(*arguments)
        assert (code, "DESK_SECRET" in err) == (Exit.SETTINGS, True)


def test_how_a_stream_stands(house: House) -> None:
    for days, word in ((5, "too short"), (BEFORE, "steady"), (len(COUNTS), "unsettled")):
        house.serve(days)
        house.ask("poll")
        assert house.stands() == word
    house.settle(SETTINGS + "\n[judgement]\nwindow = 4\n")
    assert house.stands() == "steady"
    house.pretend(rounds, started_utc=datetime(2026, 1, 1, tzinfo=UTC))
    assert house.stands() == "late"
    assert "last reached at 2026-01-01 00:00 UTC" in house.run("streams")[1]
    house.settle(SETTINGS.replace('name = "plays"', 'name = "other"'))
    assert house.stands() is None
    assert "no longer in the settings" in house.run("streams")[1]


def test_try_source_stores_nothing(house: House) -> None:
    house.serve(BEFORE)
    tried = house.ask("try-source", "plays")
    assert [(one["id"], len(one["readings"])) for one in tried["streams"]] == [(STREAM, BEFORE)]
    assert [one["row"] for one in tried["kept_out"]] == [BEFORE + 1]
    assert not (house.folder / "store.sqlite").exists()
    assert house.run("try-source", "other")[0] == Exit.NOT_FOUND


def test_a_source_that_cannot_be_read(house: House) -> None:
    assert house.run("try-source", "plays")[0] == Exit.UNREADABLE
    code, out, _ = house.run("poll")
    assert (code, "plays.csv cannot be opened" in out) == (Exit.UNREADABLE, True)
    assert house.run("poll", "other")[0] == Exit.NOT_FOUND


def test_try_outlet_sends_a_trial_and_stores_nothing(house: House, receiver, answer) -> None:
    assert house.ask("try-outlet", "desk")["taken"]
    (got,) = receiver.received
    assert _verified(got)["type"] == "trial"
    receiver.will(answer(500))
    assert house.run("try-outlet", "desk")[0] == Exit.NOT_DELIVERED
    assert house.run("try-outlet", "other")[0] == Exit.NOT_FOUND
    assert not (house.folder / "store.sqlite").exists()


def test_the_daemon_ends_well_when_it_is_told_to(house: House, receiver) -> None:
    house.settle(SETTINGS.replace('"1h"', '"1s"'))
    house.poll_before_the_fall()
    program = [sys.executable, "-m", "service.cli.main", "run", "--settings", "knickpoint.toml"]
    env = {**os.environ, "PYTHONPATH": str(Path(service.__file__).parent.parent)}
    with subprocess.Popen(program, cwd=house.folder, env=env, stderr=subprocess.PIPE, text=True) as daemon:
        came = receiver.came.wait(30)
        began = time.monotonic()
        daemon.send_signal(signal.SIGTERM)
        _, log = daemon.communicate(timeout=20)
    assert came, log
    assert daemon.returncode == Exit.GOOD
    assert time.monotonic() - began < 10
    assert "event=stopped" in log
    assert SECRET not in log
    (got,) = receiver.received
    assert _verified(got)["stream"]["id"] == STREAM


def test_an_interrupted_command_leaves_with_its_code(monkeypatch) -> None:
    monkeypatch.setattr("service.replay.given.sys", _Interrupted())
    assert run_command(["replay", "-"]) == Exit.INTERRUPTED


class _Interrupted:
    class stdin:  # noqa: N801 - stands for sys.stdin
        class buffer:  # noqa: N801
            @staticmethod
            def read(_most: int) -> bytes:
                raise KeyboardInterrupt
