"""A settings file, a database with one stream of everything, and the command line on both."""

import datetime
import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from detectors.advance import advance, start
from detectors.judge import Rule
from detectors.model import Model
from detectors.observation import Observation
from detectors.posterior import Quantiles
from service.cli.main import run_command
from storage import migrate
from storage.engine import open_store
from storage.outbox import Attempt, NewDelivery, add_delivery, record_last_failure
from storage.posteriors import NewPosterior, write_posteriors
from storage.rounds import FAILED, GOOD, KeptOutRow, RoundCounts, begin_round, end_round, note_counts
from storage.shifts import EMERGING, LIVE, Shift, record_shift
from storage.streams import SeenStream, see_streams

NOW = datetime.datetime(2026, 3, 2, 14, 0, tzinfo=datetime.UTC)
SETTINGS = """
[service]
database = "{database}"
zone = "Europe/Berlin"

[[source]]
name = "plays"
kind = "csv"
path = "plays.csv"

[source.fields]
at = "day"
count = "plays"

[source.streams]
shape = "calendar"
interval = "week"
absent = "missing"
"""
COUNTS = [104, 97, 118, 90, None, 101]
MONDAYS = [datetime.date(2026, 1, 5) + datetime.timedelta(weeks=week) for week in range(len(COUNTS))]

Shown = tuple[int, str, str]


@pytest.fixture
def settings(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A settings file whose database is not there yet."""
    file = tmp_path / "knickpoint.toml"
    file.write_text(SETTINGS.format(database=tmp_path / "store.sqlite"), encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    return file


@pytest.fixture
def run(settings: Path, capsys: pytest.CaptureFixture[str]) -> Callable[..., Shown]:
    """Runs a command line under those settings: exit code, standard output, standard error."""

    def run(*arguments: str) -> Shown:
        code = run_command(["--settings", str(settings), *arguments])
        shown = capsys.readouterr()
        return code, shown.out, shown.err

    return run


@pytest.fixture
def ask(run: Callable[..., Shown]) -> Callable[..., Any]:
    """Runs a command with --json and gives its answer."""

    def ask(*arguments: str) -> Any:
        code, out, err = run(*arguments, "--json")
        assert code == 0, err
        return json.loads(out)

    return ask


@pytest.fixture
def filled(tmp_path: Path) -> None:
    """The database, with a stream, its history, a shift, a delivery that was given up, and two rounds."""
    with open_store(str(tmp_path / "store.sqlite")) as store:
        migrate.upgrade(store)
        with store.writing() as conn:
            see_streams(
                conn, [SeenStream("quay", "plays", "q", "Quay [Stories]", "house", "calendar")], now=NOW
            )
            write_posteriors(conn, "quay", _posteriors(), now=NOW)
            record_shift(conn, _shift())
            add_delivery(conn, NewDelivery("d-1", "desk", "s-1", b'{"moved": "Quay"}', NOW, NOW))
            record_last_failure(conn, "d-1", Attempt(NOW, "refused", 500, "The receiver answered 500.", 0.25))
            first, second = (begin_round(conn, "plays", now=NOW) for _ in range(2))
            kept_out = (KeptOutRow(3, "count must be 0 or more; got -4.", "count: -4"),)
            note_counts(conn, first, RoundCounts(5, 4, 1, 0, kept_out=kept_out))
            end_round(conn, first, GOOD, now=NOW + datetime.timedelta(seconds=2))
            end_round(conn, second, FAILED, now=NOW, message="The source answered 503.")


def _posteriors() -> list[NewPosterior]:
    observations = [Observation(week, count) for week, count in enumerate(COUNTS)]
    said = advance(start(Model(dispersions=(8.0,), wanders=((0.0, 1.0),))), observations, Rule()).posteriors
    return [
        NewPosterior(place, monday.isoformat(), monday, count, posterior, "f-1", None)
        for place, (monday, count, posterior) in enumerate(zip(MONDAYS, COUNTS, said, strict=True))
        if posterior is not None
    ]


def _shift() -> Shift:
    return Shift(
        id="s-1",
        stream_id="quay",
        origin=LIVE,
        state=EMERGING,
        announced_key="2026-02-09",
        announced_position=5,
        announced_at=MONDAYS[5],
        announced_utc=NOW,
        start_key="2026-01-26",
        start_position=3,
        start_at=MONDAYS[3],
        region=(2, 3),
        probability=0.93,
        level_before=Quantiles(90.0, 100.0, 110.0),
        level_after=Quantiles(50.0, 60.0, 70.0),
        late=False,
        fingerprint="f-1",
        reading_id=None,
    )
