"""Errors and their exit codes."""

from importlib import import_module

import pytest

from service.exit_codes import MEANINGS, Exit, code_for, explains_itself, named_errors


@pytest.mark.parametrize("name", named_errors())
def test_every_error_of_the_table_exists(name: str) -> None:
    module, _, kind = name.rpartition(".")
    assert issubclass(getattr(import_module(module), kind), Exception)


def test_every_code_has_a_meaning() -> None:
    assert set(MEANINGS) == set(Exit)
    assert all(0 <= code < 126 or code == 130 for code in Exit)


def test_the_nearest_ancestor_decides() -> None:
    from storage.errors import NoSuchRow, SchemaTooNew

    assert code_for(NoSuchRow("shift", "x")) is Exit.NOT_FOUND
    assert code_for(SchemaTooNew("a", "9", "1")) is Exit.DATABASE


def test_an_error_of_the_program_is_trouble_and_shows_its_traceback() -> None:
    assert code_for(KeyError("x")) is Exit.TROUBLE
    assert not explains_itself(KeyError("x"))


def test_an_interruption() -> None:
    assert code_for(KeyboardInterrupt()) is Exit.INTERRUPTED
