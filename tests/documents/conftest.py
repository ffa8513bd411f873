"""The two documents, and what can be picked out of them."""

import re
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]


@dataclass(frozen=True)
class Written:
    """A Markdown file."""

    text: str

    def rows(self, first_heading: str) -> list[list[str]]:
        """The rows of the table whose first column has this heading, cell by cell."""
        lines = iter(self.text.splitlines())
        for line in lines:
            if line.startswith(f"| {first_heading} |"):
                next(lines)
                return list(_cells(lines))
        raise LookupError(first_heading)

    def block(self, containing: str) -> list[str]:
        """The lines of the fenced block that contains a text."""
        blocks: list[str] = re.findall(r"^```\w*\n(.*?)^```", self.text, re.MULTILINE | re.DOTALL)
        (found,) = [block for block in blocks if containing in block]
        return found.splitlines()


def _cells(lines: Iterator[str]) -> Iterator[list[str]]:
    for line in lines:
        if not line.startswith("|"):
            return
        yield [cell.strip() for cell in line.strip("|").split(" | ")]


@pytest.fixture(scope="session")
def root() -> Path:
    return ROOT


@pytest.fixture(scope="session")
def readme() -> Written:
    return Written((ROOT / "README.md").read_text(encoding="utf-8"))


@pytest.fixture(scope="session")
def developers() -> Written:
    return Written((ROOT / "DEVELOPERS.md").read_text(encoding="utf-8"))
