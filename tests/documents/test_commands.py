"""Every command is documented where people look: in its own help, and its exit codes in the help of all."""

import click
import pytest

from service.cli.main import COMMANDS, knickpoint
from service.exit_codes import MEANINGS

CONTEXT = click.Context(knickpoint, info_name="knickpoint")

# The commands of the first part of the tool, as agreed; a name that people have typed does not go away.
AGREED = {
    "init", "check", "try-source", "try-outlet", "run", "poll", "rounds", "streams", "history", "shifts",
    "deliveries", "send-again", "hush", "rebuild", "migrate", "replay", "demo",
}  # fmt: skip
WITHOUT_JSON = {"init", "run", "demo"}


def _command(name: str) -> click.Command:
    command = knickpoint.get_command(CONTEXT, name)
    assert command is not None
    return command


def test_all_agreed_commands_are_there() -> None:
    assert set(COMMANDS) >= AGREED


@pytest.mark.parametrize("name", COMMANDS)
def test_a_command_has_help_that_fits_its_line(name: str) -> None:
    command = _command(name)
    assert command.name == name
    assert command.help
    assert command.short_help
    assert not command.get_short_help_str(limit=60).endswith("...")


@pytest.mark.parametrize("name", COMMANDS)
def test_every_option_says_what_it_is_for(name: str) -> None:
    options = [each for each in _command(name).params if isinstance(each, click.Option)]
    assert [option.name for option in options if not option.help] == []


@pytest.mark.parametrize("name", sorted(set(COMMANDS) - WITHOUT_JSON))
def test_what_shows_something_can_show_it_to_machines(name: str) -> None:
    assert "--json" in {text for each in _command(name).params for text in each.opts}


@pytest.mark.parametrize("name", sorted(set(COMMANDS) - {"replay", "demo"}))
def test_the_settings_file_may_be_named_after_the_command(name: str) -> None:
    assert "--settings" in {text for each in _command(name).params for text in each.opts}


def test_exit_codes_are_in_the_help() -> None:
    shown = knickpoint.get_help(CONTEXT)
    for code, meaning in MEANINGS.items():
        assert f"{code.value:>3}  {meaning}" in shown
