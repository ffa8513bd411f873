"""Help must be instant: it imports nothing that computes, stores, fetches or draws."""

import json
import subprocess
import sys

import pytest

from service.cli.main import COMMANDS

HEAVY = (
    "numpy",
    "scipy",
    "pydantic",
    "sqlalchemy",
    "alembic",
    "httpx",
    "apscheduler",
    "rich",
    "jsonpath",
    "config.load",
    "detectors",
    "storage",
)
PROGRAM = """
import json, sys
from service.cli.main import run_command
code = run_command(sys.argv[1:])
print()
print(json.dumps([code, sorted(sys.modules)]))
"""


def _run(*arguments: str) -> tuple[int, set[str], str]:
    done = subprocess.run(
        [sys.executable, "-c", PROGRAM, *arguments], capture_output=True, text=True, timeout=60, check=True
    )
    shown, _, last = done.stdout.rstrip().rpartition("\n")
    code, modules = json.loads(last)
    return code, set(modules), shown


@pytest.mark.parametrize(
    "arguments",
    [("--help",), ("--version",), ("-h",), *((name, "--help") for name in COMMANDS)],
    ids=" ".join,
)
def test_it_imports_nothing_heavy(arguments: tuple[str, ...]) -> None:
    code, modules, shown = _run(*arguments)
    assert code == 0
    assert shown.strip()
    assert sorted(modules & set(HEAVY)) == []


def test_a_command_that_works_is_seen_to_import_what_it_needs() -> None:
    # So that the test above cannot pass by looking in the wrong place.
    code, modules, _ = _run("replay", "no-such-file.csv")
    assert code == 4
    assert {"numpy", "detectors"} <= modules
