"""Every path that a document names exists; none of them is a path of somebody's machine."""

import re
from pathlib import Path
from typing import Any

import pytest

TOP = r"(?:config|deploy|detectors|service|storage|tests|\.ci)"
# Written by deploy/prove, on whatever machine it runs; a fresh clone may not have it.
WRITTEN_LATER = "deploy/proved"


@pytest.fixture(params=["readme", "developers"])
def written(request: pytest.FixtureRequest) -> Any:
    return request.getfixturevalue(request.param)


def test_named_paths_exist(written: Any, root: Path) -> None:
    named = set(re.findall(rf"(?<![\w/.-]){TOP}/[\w./-]*[\w/]", written.text))
    assert len(named) > 5
    assert {
        path for path in named if not (root / path).exists() and not path.startswith(WRITTEN_LATER)
    } == set()


def test_links_lead_to_files(written: Any, root: Path) -> None:
    targets = re.findall(r"\]\(([^)]+)\)", written.text)
    assert targets
    assert [target for target in targets if not (root / target).is_file()] == []


def test_no_path_of_a_machine(written: Any) -> None:
    assert re.findall(r"(?<![\w./])/[a-z]+/[\w./-]*", written.text) == []
