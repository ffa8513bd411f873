"""The demo from end to end, as a newcomer sees it. The slowest test here: the story takes its time."""

import json
import shlex
import tomllib
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from service.cli.main import knickpoint
from service.demo.main import run_demo
from service.demo.place import LOG, SETTINGS, stream_id
from service.demo.story import FALLING_SHOW, HISTORY_DAYS, HIT, HIT_SHOW, SHOWS, count_of

SECONDS = 150.0
"""Far more than a minute: a machine under test is busy. It ends by itself when the story is told."""


class Told:
    """One run of the demo: its folder, its exit code, its screen."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.code = -1
        self.screen = ""

    @property
    def words(self) -> str:
        """The screen without its line breaks, which depend on the folder's name."""
        return " ".join(self.screen.split())

    def ask(self, *arguments: str) -> object:
        result = self.run(*arguments, "--json", "--settings", str(self.folder / SETTINGS))
        assert result.exit_code == 0, result.output
        return json.loads(result.stdout)

    def run(self, *arguments: str) -> Result:
        return CliRunner().invoke(knickpoint, arguments)


@pytest.fixture(scope="module")
def told(tmp_path_factory: pytest.TempPathFactory) -> Told:
    """The demo is run once, through the command line, and then asked about."""
    one = Told(tmp_path_factory.mktemp("demo"))
    result = one.run("demo", "--folder", str(one.folder), "--seconds", str(SECONDS))
    one.code, one.screen = result.exit_code, result.output
    return one


def test_the_alert_arrives_exactly_once(told: Told) -> None:
    assert told.code == 0, told.screen
    assert told.words.count("its signature is right") == 1
    assert f"{FALLING_SHOW.name}: the filtered level fell by about" in told.words
    deliveries = told.ask("deliveries")
    assert [(one["outlet"], one["state"]) for one in _rows(deliveries)] == [("desk", "delivered")]


def test_the_screen_says_that_all_is_invented_and_shows_the_settings(told: Told) -> None:
    text = (told.folder / SETTINGS).read_text(encoding="utf-8")
    assert "is invented, and so are its 6 shows and all their counts" in told.words
    assert all(line in told.screen for line in text.splitlines())
    assert tomllib.loads(text)["source"][0]["every"] == "12h"


def test_the_runaway_hit_rings_nobody(told: Told) -> None:
    assert f"{count_of(HIT_SHOW, HIT.day):,} listens" in told.words
    assert "counted as a one-off" in told.words
    assert f"The runaway hit of {HIT_SHOW.name} rang nobody." in told.words
    assert _rows(told.ask("shifts", "--stream", stream_id(HIT_SHOW.name))) == []


def test_shifts_of_the_history_are_recorded_and_not_told(told: Told) -> None:
    found, live = (_rows(told.ask("shifts", "--origin", origin)) for origin in ("history", "live"))
    turned = {show for show in SHOWS if show.turns}
    assert {one["stream"] for one in found} == {stream_id(show.name) for show in turned - {FALLING_SHOW}}
    assert [one["told"] for one in found] == [None, None]
    assert [one["stream"] for one in live] == [stream_id(FALLING_SHOW.name)]


def test_the_history_is_stored_from_the_first_count_on(told: Told) -> None:
    rows = _rows(told.ask("history", stream_id(HIT_SHOW.name), "--limit", "1000"))
    assert len(rows) > HIT.day > HISTORY_DAYS
    assert [row["count"] for row in rows] == [count_of(HIT_SHOW, day) for day in range(len(rows))]
    assert rows[HIT.day]["one_off"] > 0.8


def test_every_round_reached_the_source(told: Told) -> None:
    outcomes = [one["outcome"] for one in _rows(told.ask("rounds", "--limit", "1000"))]
    assert outcomes[-1] == "good"
    # On a slow machine every round may find a new day.
    assert set(outcomes) <= {"good", "nothing new"}
    assert " level=error " not in (told.folder / LOG).read_text(encoding="utf-8")


def test_every_command_that_the_screen_names_works_afterwards(told: Told) -> None:
    named = [line.strip() for line in told.screen.splitlines() if line.endswith(f"/{SETTINGS}")]
    commands = [shlex.split(line)[1:] for line in named if line.startswith("knickpoint ")]
    assert [command[0] for command in commands] == ["streams", "history", "history", "shifts", "deliveries"]
    assert [told.run(*command).exit_code for command in commands] == [0] * len(commands)


def test_without_time_it_says_honestly_that_no_alert_came(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run_demo(tmp_path, 3.0) == 1
    assert "No alert about The Moss Parliament arrived within 3 seconds:" in " ".join(
        capsys.readouterr().out.split()
    )


def test_a_second_run_leaves_the_folder_of_the_first_alone(told: Told) -> None:
    before = sorted((one.name, one.stat().st_mtime_ns) for one in told.folder.iterdir())
    with pytest.raises(FileExistsError):
        run_demo(told.folder, SECONDS)
    assert sorted((one.name, one.stat().st_mtime_ns) for one in told.folder.iterdir()) == before


def _rows(document: object) -> list[dict[str, object]]:
    """The list in a command's JSON document, whatever stands beside it."""
    if isinstance(document, list):
        return document
    assert isinstance(document, dict)
    (rows,) = (value for value in document.values() if isinstance(value, list))
    return rows
