"""`poll` and `rebuild` below the command line: a settings file, a table, and the machine's own clock."""

from pathlib import Path

import pytest

from service.cli.main import run_command
from service.exit_codes import Exit
from service.poll import UnknownSource, poll_once
from service.rebuild import Rebuilt, rebuild_stream
from storage.engine import open_store
from storage.errors import NoSuchRow
from storage.posteriors import history
from storage.rounds import FAILED, GOOD, NOTHING_NEW

SETTINGS = """
[[source]]
name = "plays"
kind = "csv"
path = "plays.csv"
every = "1h"
leave_out = ["trailers"]

  [source.fields]
  at = "day"
  count = "plays"
  split = "show"

  [source.streams]
  shape = "calendar"
  interval = "week"
  absent = "missing"

[[source]]
name = "letters"
kind = "csv"
path = "nonesuch.csv"
every = "1h"

  [source.fields]
  at = "day"
  count = "opens"

  [source.streams]
  shape = "calendar"
  interval = "week"
  absent = "missing"
"""


@pytest.fixture
def settings(tmp_path: Path, studio, counts_of) -> Path:
    studio.weekly("quay", counts_of(1, (1000, 14)))
    lines = [f"{row['day']},{row['show']},{row['plays']}" for row in studio.rows]
    (tmp_path / "plays.csv").write_text("\n".join(["day,show,plays", *lines, ""]), encoding="utf-8")
    path = tmp_path / "house.toml"
    path.write_text(SETTINGS, encoding="utf-8")
    return path


def test_polling_by_hand(settings: Path) -> None:
    plays, letters = poll_once(settings, []).rounds
    assert (plays.source, plays.outcome, plays.rows_used) == ("plays", GOOD, 14)
    assert (letters.source, letters.outcome) == ("letters", FAILED)
    assert "nonesuch.csv" in (letters.message or "")
    (again,) = poll_once(settings, ["plays"]).rounds
    assert (again.outcome, again.rows_used) == (NOTHING_NEW, 0)


def test_polling_says_that_a_stream_could_not_be_folded(settings: Path, tmp_path: Path) -> None:
    (tmp_path / "plays.csv").write_text("day,show,plays\n1001-01-01,quay,5\n", encoding="utf-8")
    settings.write_text(SETTINGS.replace('interval = "week"', 'interval = "day"'), encoding="utf-8")
    assert poll_once(settings, ["plays"]).unfolded == 0
    with (tmp_path / "plays.csv").open("a", encoding="utf-8") as file:
        file.write("2026-01-01,quay,6\n")
    polled = poll_once(settings, ["plays"])
    assert polled.unfolded == 1
    assert "absent intervals" in (polled.rounds[0].message or "")
    assert run_command(["--settings", str(settings), "poll", "plays"]) == Exit.TROUBLE


def test_a_source_that_is_not_there(settings: Path, tmp_path: Path) -> None:
    with pytest.raises(UnknownSource, match="letters"):
        poll_once(settings, ["plays", "mail"])
    assert not (tmp_path / "knickpoint.sqlite").exists()


def test_rebuilding_by_hand(settings: Path, tmp_path: Path) -> None:
    poll_once(settings, ["plays"])
    with open_store(str(tmp_path / "knickpoint.sqlite")) as store:
        with store.reading() as conn:
            before = [row.history for row in history(conn, "plays/quay")]
        assert rebuild_stream(settings, "plays/quay") == Rebuilt("plays/quay", 14, 0)
        with store.reading() as conn:
            assert [row.history for row in history(conn, "plays/quay")] == before
    with pytest.raises(NoSuchRow):
        rebuild_stream(settings, "plays/mill")
    settings.write_text(SETTINGS.replace("trailers", "quay"), encoding="utf-8")
    assert rebuild_stream(settings, "plays/quay") == Rebuilt("plays/quay", None, 0)
