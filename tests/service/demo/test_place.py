"""The demo's folder, and the commands that it names."""

import os
import stat
import sys
from pathlib import Path

import pytest

from config.loading import load_settings
from service.demo.next_steps import about_the_demo, about_your_own, program_name
from service.demo.place import ADDRESS, SECRET, make_folder, new_secret, write_settings
from service.demo.story import FALLING_SHOW, HIT_SHOW

COUNTING, DESK = "http://127.0.0.1:1234/counts", "http://127.0.0.1:1235/alerts"


def test_the_settings_need_nothing_but_the_folder(tmp_path: Path) -> None:
    secret = new_secret()
    path = write_settings(tmp_path, counting=COUNTING, desk=DESK, secret=secret)
    settings = load_settings(path, {})
    assert settings.service.database.parent == tmp_path
    assert [source.address for source in settings.sources] == [COUNTING]
    (outlet,) = settings.outlets
    assert (outlet.address.reveal(), outlet.secret.reveal()) == (DESK, secret)


def test_only_its_owner_reads_the_secrets(tmp_path: Path) -> None:
    secret = new_secret()
    path = write_settings(tmp_path, counting=COUNTING, desk=DESK, secret=secret)
    assert [stat.S_IMODE((tmp_path / name).stat().st_mode) for name in (ADDRESS, SECRET)] == [0o600, 0o600]
    assert secret not in path.read_text(encoding="utf-8")


def test_a_folder_in_use_is_left_as_it_is(tmp_path: Path) -> None:
    mine = tmp_path / "knickpoint.toml"
    mine.write_text("# mine\n", encoding="utf-8")
    with pytest.raises(FileExistsError, match="holds one: name another folder"):
        make_folder(tmp_path)
    assert [one.name for one in tmp_path.iterdir()] == [mine.name]
    assert mine.read_text(encoding="utf-8") == "# mine\n"


def test_a_folder_is_made_where_one_is_named(tmp_path: Path) -> None:
    assert make_folder(tmp_path / "a" / "b").is_dir()


def test_without_a_name_it_is_a_new_temporary_one() -> None:
    one, other = make_folder(None), make_folder(None)
    assert one != other
    one.rmdir()
    other.rmdir()


def _start_as(monkeypatch: pytest.MonkeyPatch, program: Path, path: Path) -> None:
    program.parent.mkdir(parents=True, exist_ok=True)
    program.write_text("#!/bin/sh\n", encoding="utf-8")
    program.chmod(0o755)
    monkeypatch.setattr(sys, "argv", [str(program), "demo"])
    monkeypatch.setenv("PATH", str(path))


def test_the_program_is_named_as_it_can_be_typed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    program = tmp_path / "house of counts" / ".venv" / "bin" / "knickpoint"
    _start_as(monkeypatch, program, tmp_path)
    monkeypatch.chdir(tmp_path / "house of counts")
    assert program_name() == ".venv/bin/knickpoint"
    monkeypatch.chdir(os.sep)
    assert program_name() in (f"'{program}'", f"'{str(program).removeprefix(os.sep)}'")
    monkeypatch.setenv("PATH", str(program.parent))
    assert program_name() == "knickpoint"
    monkeypatch.setattr(sys, "argv", ["/somewhere/main.py"])
    assert program_name() == "knickpoint"


def test_the_commands_are_whole(tmp_path: Path) -> None:
    asked = dict(about_the_demo("knickpoint", tmp_path / "a b" / "knickpoint.toml"))
    assert f"'counts/{FALLING_SHOW.name}'" in asked["the fall, day by day"]
    assert f"'counts/{HIT_SHOW.name}'" in asked["the runaway hit"]
    assert all(command.endswith(f"--settings '{tmp_path}/a b/knickpoint.toml'") for command in asked.values())
    assert [command for _, command in about_your_own("x")][:2] == ["x replay FILE.csv", "x init"]
