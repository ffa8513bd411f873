"""The command line as a whole."""

import pytest

from service.cli.installation import require_own_packages
from service.cli.main import run_command


def test_an_unknown_command_is_wrong_use(capsys: pytest.CaptureFixture[str]) -> None:
    assert run_command(["nonesuch"]) == 2
    assert "nonesuch" in capsys.readouterr().err


def test_an_unknown_option_is_wrong_use(capsys: pytest.CaptureFixture[str]) -> None:
    assert run_command(["streams", "--nonesuch"]) == 2
    assert "--nonesuch" in capsys.readouterr().err


def test_an_error_is_one_sentence_on_standard_error(capsys: pytest.CaptureFixture[str]) -> None:
    assert run_command(["replay", "/nonesuch.csv"]) == 4
    shown = capsys.readouterr()
    assert shown.out == ""
    assert shown.err.count("\n") == 1
    assert "/nonesuch.csv" in shown.err


def test_an_unreadable_moment_says_what_is_needed(capsys: pytest.CaptureFixture[str]) -> None:
    assert run_command(["hush", "x", "--until", "next week"]) == 2
    assert "2026-03-02" in capsys.readouterr().err


def test_our_packages_are_our_own() -> None:
    require_own_packages()
