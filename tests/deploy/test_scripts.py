"""The scripts that a stranger starts first."""

import os
import subprocess
import tomllib
from pathlib import Path

import pytest
from packaging.requirements import Requirement
from packaging.utils import canonicalize_name

ROOT = Path(__file__).parents[2]
SCRIPTS = ("deploy/try", "deploy/test", "deploy/check", "deploy/prove", ".ci/run")


@pytest.mark.parametrize("name", SCRIPTS)
def test_a_script_can_be_started_and_stops_at_the_first_fault(name: str) -> None:
    script = ROOT / name
    assert os.access(script, os.X_OK)
    text = script.read_text(encoding="utf-8")
    assert text.startswith("#!/usr/bin/env bash\n")
    assert "\nset -euo pipefail\n" in text


@pytest.mark.parametrize("name", [*SCRIPTS, "deploy/setup.sh"])
def test_bash_understands_it(name: str) -> None:
    done = subprocess.run(["bash", "-n", str(ROOT / name)], capture_output=True, text=True, timeout=30)
    assert (done.returncode, done.stderr) == (0, "")


def test_ci_runs_the_check_and_then_the_tests() -> None:
    lines = (ROOT / ".ci/run").read_text(encoding="utf-8").splitlines()
    assert [line for line in lines if line.startswith("deploy/")] == ["deploy/check", "deploy/test"]


def _pinned() -> dict[str, str]:
    lines = (ROOT / "deploy/constraints.txt").read_text(encoding="utf-8").splitlines()
    pairs = (line.split("==") for line in lines if line and not line.startswith("#"))
    return {canonicalize_name(name): version for name, version in pairs}


def _required() -> list[Requirement]:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    extras = project["optional-dependencies"].values()
    return [
        Requirement(text)
        for text in [*project["dependencies"], *(each for extra in extras for each in extra)]
    ]


def test_every_requirement_is_pinned_to_a_version_that_it_allows() -> None:
    pinned = _pinned()
    unfit = [
        str(each)
        for each in _required()
        if canonicalize_name(each.name) not in pinned
        or not each.specifier.contains(pinned[canonicalize_name(each.name)], prereleases=True)
    ]
    assert unfit == []
