"""`knickpoint init` and `knickpoint check`."""

from collections.abc import Callable
from pathlib import Path

import pytest

from service.cli.errors import AlreadyThere
from service.cli.writing import write_new

Run = Callable[..., tuple[int, str, str]]


def test_a_file_that_is_there_is_never_overwritten(tmp_path: Path) -> None:
    file = tmp_path / "a.toml"
    file.write_text("mine", encoding="utf-8")
    with pytest.raises(AlreadyThere):
        write_new(file, "other")
    assert file.read_text(encoding="utf-8") == "mine"


def test_init_writes_once(run: Run, settings: Path) -> None:
    settings.unlink()
    code, out, _ = run("init")
    assert code == 0
    assert str(settings) in out
    written = settings.read_text(encoding="utf-8")
    assert run("init")[0] == 1
    assert settings.read_text(encoding="utf-8") == written


def test_init_can_be_given_another_place(run: Run, tmp_path: Path) -> None:
    assert run("init", str(tmp_path / "other.toml"))[0] == 0
    assert (tmp_path / "other.toml").exists()


def test_check_says_all_faults_at_once(run: Run, settings: Path) -> None:
    settings.write_text('[service]\ndatabas = "x.sqlite"\nzone = "Nowhere/Town"\n', encoding="utf-8")
    code, _, err = run("check")
    assert code == 3
    assert "database" in err
    assert "Nowhere/Town" in err
