"""What DEVELOPERS.md says, held against the tree."""

import re
from pathlib import Path
from typing import Any

import pytest

from config.streams import FINGERPRINT_VERSION
from detectors.checkpoint_bytes import FORMAT
from detectors.model import MODEL_VERSION
from service.sources.plans import READING_VERSION
from service.tell.alert_body import SCHEMA
from storage.codec import VERSION

PACKAGES = ("config", "detectors", "storage", "service")


def _rooms(root: Path) -> set[str]:
    """Every package, every folder of tests, and the folders of scripts."""
    packages = {init.parent for name in PACKAGES for init in (root / name).rglob("__init__.py")}
    tests = {folder for folder in (root / "tests").iterdir() if folder.is_dir() and any(folder.glob("*.*"))}
    return {
        f"{folder.relative_to(root).as_posix()}/"
        for folder in (*packages, *tests, root / "deploy", root / ".ci")
        if folder.name != "__pycache__"
    }


def test_the_rooms_are_those_of_the_tree(developers: Any, root: Path) -> None:
    named = [row[0].strip("`") for row in developers.rows("Room")]
    assert len(named) == len(set(named))
    # tests/service holds folders only beside its own files; it is a room all the same.
    assert set(named) == _rooms(root)


def _code(root: Path) -> str:
    files = [
        file
        for name in PACKAGES
        for kind in ("*.py", "*.toml", "*.json")
        for file in (root / name).rglob(kind)
    ]
    measured = (root / "tests" / "benchmarks").glob("*.py")
    return "\n".join(file.read_text(encoding="utf-8").lower() for file in (*files, *measured))


def test_every_word_of_the_glossary_is_used(developers: Any, root: Path) -> None:
    code = _code(root)
    words = [word for row in developers.rows("Word") for word in row[0].split(", ")]
    assert len(words) == len(set(words)) > 50
    unused = [word for word in words if not re.search(rf"\b{re.sub('[ -]', '[ _-]', word)}", code)]
    assert unused == []


def test_versions_are_those_of_the_code(developers: Any, root: Path) -> None:
    migrations = sorted(file.name for file in (root / "storage/migrations/versions").glob("v*.py"))
    versions = {row[0]: row[2] for row in developers.rows("Form")}
    assert versions == {
        "tables": migrations[-1][1:5],
        "checkpoint": str(FORMAT),
        "model": str(MODEL_VERSION),
        "stored posterior": str(VERSION),
        "settings fingerprint": str(FINGERPRINT_VERSION),
        "how documents are read": str(READING_VERSION),
        "alert": str(SCHEMA),
    }


def test_what_stands_in_a_file_stands_there(developers: Any, root: Path) -> None:
    """Names given as `NAME` in `file`."""
    pairs = re.findall(r"`(\w+)`\s+in\s+`([\w/]+\.py)`", developers.text)
    assert len(pairs) > 5
    for name, file in pairs:
        assert re.search(rf"\b{name}\b", (root / file).read_text(encoding="utf-8")), (name, file)


def test_decisions_are_short_and_numbered(developers: Any) -> None:
    _, after = developers.text.split("\n## Decisions\n")
    section, _ = after.split("\n## ", maxsplit=1)
    decisions = re.findall(r"^\*\*(\d+)\. .+?(?=^\*\*|\Z)", section, re.MULTILINE | re.DOTALL)
    assert decisions == [str(number) for number in range(1, len(decisions) + 1)]
    longest = max(
        len(part.strip().splitlines()) for part in re.split(r"^(?=\*\*\d)", section, flags=re.MULTILINE)
    )
    assert longest <= 10


@pytest.mark.parametrize("name", ["readme", "developers"])
def test_lines_fit_a_screen(name: str, request: pytest.FixtureRequest) -> None:
    """Tables and output aside."""
    text = re.sub(r"^```.*?^```", "", request.getfixturevalue(name).text, flags=re.MULTILINE | re.DOTALL)
    assert [line for line in text.splitlines() if len(line) > 120 and not line.startswith("|")] == []
