"""The command line as a whole."""

import subprocess
import sys
from pathlib import Path

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


def test_without_a_command_the_help_is_shown(capsys: pytest.CaptureFixture[str]) -> None:
    assert run_command([]) == 2
    shown = capsys.readouterr()
    assert "Exit codes:" in shown.out + shown.err


def test_a_reader_that_goes_away_is_no_fault_of_the_program(tmp_path: Path) -> None:
    file = tmp_path / "counts.csv"
    rows = (f"{1000 + year},{year % 7}" for year in range(400))
    file.write_text("\n".join(["at,count", *rows]), encoding="utf-8")
    program = [
        sys.executable,
        "-m",
        "service.cli.main",
        "replay",
        str(file),
        "--wander",
        "0",
        "--dispersion",
        "8",
    ]
    with subprocess.Popen(program, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True) as running:
        assert running.stdout is not None
        assert running.stderr is not None
        running.stdout.close()
        assert running.stderr.read() == ""
        assert running.wait(timeout=60) == 1
