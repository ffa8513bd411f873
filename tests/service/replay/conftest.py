"""Files to replay, and what the command says of them."""

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from service.cli.main import run_command

Replay = Callable[..., dict[str, Any]]


def _refuse(name: str) -> None:
    raise AssertionError(f"{name} is not JSON")


@pytest.fixture
def replayed(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> Replay:
    """Writes lines to a file, replays it, and gives the JSON answer."""

    def replay(lines: list[str], *options: str) -> dict[str, Any]:
        file = tmp_path / "counts.csv"
        file.write_text("\n".join(lines) + "\n", encoding="utf-8")
        code = run_command(["replay", str(file), "--json", "--wander", "0", "--dispersion", "4,16", *options])
        shown = capsys.readouterr()
        assert code == 0, shown.err
        answer: dict[str, Any] = json.loads(shown.out, parse_constant=_refuse)
        return answer

    return replay


@pytest.fixture
def refused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> Callable[..., tuple[int, str]]:
    """Writes lines to a file, replays it in vain, and gives exit code and sentence."""

    def replay(lines: list[str], *options: str) -> tuple[int, str]:
        file = tmp_path / "counts.csv"
        file.write_text("\n".join(lines) + "\n", encoding="utf-8")
        code = run_command(["replay", str(file), *options])
        shown = capsys.readouterr()
        assert shown.out == ""
        return code, shown.err

    return replay
