"""The examples in the docstrings of the numerics run, and give what they say."""

import doctest
import importlib
from pathlib import Path

import pytest

import detectors

MODULES = sorted(
    f"detectors.{path.stem}" for path in Path(detectors.__path__[0]).glob("*.py") if path.stem != "__init__"
)


@pytest.mark.parametrize("name", MODULES)
def test_examples(name: str) -> None:
    result = doctest.testmod(importlib.import_module(name))
    assert result.failed == 0


@pytest.mark.parametrize(("name", "fewest"), [("gap_prior", 5), ("counts", 4), ("one_off", 3), ("judge", 2)])
def test_there_are_examples(name: str, fewest: int) -> None:
    finder = doctest.DocTestFinder(exclude_empty=True)
    found = [test for test in finder.find(importlib.import_module(f"detectors.{name}")) if test.examples]
    assert len(found) >= fewest
