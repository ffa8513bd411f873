"""A small version of what the documents quote of the default threshold; the full one takes minutes."""

import importlib.util
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest

from detectors.judge import Rule


@pytest.fixture(scope="module")
def measuring() -> ModuleType:
    spec = importlib.util.spec_from_file_location(
        "default_threshold", Path(__file__).with_name("default_threshold.py")
    )
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def test_most_falls_are_told_in_time(measuring: ModuleType) -> None:
    # Told in 80 % by the full version; 16 seeded streams say only that it is not far off.
    with ThreadPoolExecutor(1) as pool:
        fallen = measuring.folded("100", 16, pool)
    soon, later = (measuring.found(fallen, Rule(), 100, within) for within in (10, 20))
    assert soon.of == later.of == 16
    assert soon.hits <= later.hits
    assert later.hits >= 9


def test_both_documents_quote_the_same_figures(readme: Any, developers: Any) -> None:
    text = " ".join(readme.text.split())
    (row,) = [row for row in developers.rows("Threshold") if row[0].startswith("0.9")]
    assert f"0.9 rang {row[1]} times in 64,000 counts" in text
    ten, twenty = (part.split(" (")[0] for part in row[2].split(" / "))
    assert f"within 20 counts in {twenty} %" in text
    assert f"within 10 counts in only {ten} %" in text
