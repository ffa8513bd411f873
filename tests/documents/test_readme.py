"""What the README says, held against the program."""

import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import click
import pytest

from config.judging import Judgement, Model
from config.part import Part
from config.settings import Sections
from config.starter import starter_text
from service.cli.main import COMMANDS, knickpoint, run_command
from service.cli.options import SETTINGS_VARIABLE
from service.deliver.backoff import DAY, MOST_ATTEMPTS, WAITS_SECONDS
from service.demo.story import FALL, FALLING_SHOW, HIT, HIT_SHOW, HOUSE, SHOWS, count_of
from service.exit_codes import MEANINGS
from service.standing import Standing

CONTEXT = click.Context(knickpoint, info_name="knickpoint")


def _command(name: str) -> click.Command:
    command = knickpoint.get_command(CONTEXT, name)
    assert command is not None
    return command


def _options(command: click.Command) -> set[str]:
    return {text for param in command.params for text in (*param.opts, *param.secondary_opts)}


def test_the_table_has_every_command_and_no_other(readme: Any) -> None:
    named = [re.split("[` ]", row[0])[1] for row in readme.rows("Command")]
    assert named == sorted(named, key=["demo", "replay", *COMMANDS].index)
    assert set(named) == set(COMMANDS)


def test_every_option_in_the_table_is_one_of_its_command(readme: Any) -> None:
    for cell, what in readme.rows("Command"):
        name = re.split("[` ]", cell)[1]
        assert set(re.findall(r"--[a-z-]+", what)) <= _options(_command(name)), name


def test_every_command_line_names_a_command_with_such_options(readme: Any) -> None:
    lines = re.findall(r"(?:^|[`$] ?)knickpoint ([a-z-]+)((?:[^\n`])*)", readme.text, re.MULTILINE)
    named = [(name, rest) for name, rest in lines if name not in ("is", "stands")]
    assert len(named) > 10
    for name, rest in named:
        assert name in COMMANDS
        assert set(re.findall(r"--[a-z-]+", rest)) <= _options(_command(name)), (name, rest)


def test_the_exit_codes(readme: Any) -> None:
    assert readme.rows("Exit code") == [[str(int(code)), meaning] for code, meaning in MEANINGS.items()]


def test_the_standings(readme: Any) -> None:
    rows = readme.rows("Word")
    assert [row[0] for row in rows] == [one.value for one in Standing]
    shown = " ".join((_command("streams").help or "").split())
    assert all(row[1] in shown for row in rows)


def _parts(kind: type[Part] = Part) -> Iterator[type[Part]]:
    for below in kind.__subclasses__():
        yield below
        yield from _parts(below)


def test_every_key_of_the_settings_is_in_the_starter_file_or_here(readme: Any) -> None:
    assert Sections in set(_parts())
    keys = {field.alias or name for part in _parts() for name, field in part.model_fields.items()}
    assert {"threshold", "rows", "absent", "secret", "paging"} <= keys
    written = f"{readme.text} {starter_text()}"
    assert {key for key in keys if not re.search(rf"\b{key}\b", written)} == set()


def test_every_section_is_here(readme: Any) -> None:
    named = {re.sub(r'[`\[\]]|\."VALUE"', "", row[0]) for row in readme.rows("Section")}
    assert named == {
        *(field.alias or name for name, field in Sections.model_fields.items()),
        "source.fields",
        "source.streams",
        "source.stream",
    }


@pytest.mark.parametrize("part", [Judgement(), Model()], ids=["judgement", "model"])
def test_the_defaults(readme: Any, part: Part) -> None:
    for name, value in part:
        if value is not None:
            number = int(value) if float(value).is_integer() else value
            assert f"`{name}` {number}" in readme.text


def test_the_variable(readme: Any) -> None:
    assert f"`{SETTINGS_VARIABLE}`" in readme.text


def test_how_long_a_delivery_is_tried(readme: Any) -> None:
    assert "tried fourteen times over five days" in " ".join(readme.text.split())
    assert (MOST_ATTEMPTS, round(sum(WAITS_SECONDS) / DAY)) == (14, 5)


def test_the_replay_answers_as_it_is_shown(
    readme: Any, root: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    # The shown lines are those of the answer, word for word; others are left out.
    command, *shown = readme.block("replay tests/vectors")
    monkeypatch.chdir(root)
    assert run_command(command.removeprefix("$ knickpoint ").split()) == 0
    answered = capsys.readouterr().out.splitlines()
    assert len(shown) > 7
    assert [line for line in shown if line and line not in answered] == []


def test_the_demo_tells_what_is_shown(readme: Any) -> None:
    shown = " ".join(" ".join(readme.block("A minute in the life")).split())
    assert HOUSE in shown
    assert f"of {len(SHOWS)} shows" in shown
    assert f"{HIT_SHOW.name}: {count_of(HIT_SHOW, HIT.day):,} listens" in shown
    counts = [count_of(FALLING_SHOW, FALL.day + after) for after in range(2, 5)]
    told = re.findall(rf"{FALLING_SHOW.name}: ([\d,]+) listens", shown)
    assert told == [f"{count:,}" for count in counts]
    assert f"{100 * FALL.times:.0f} %" in shown


def test_invented_names_are_said_to_be_invented(readme: Any) -> None:
    text = " ".join(readme.text.split())
    assert "The house is invented, and so are its shows and counts" in text
    assert "shows and house there are invented" in text
