"""The JSON form: null, never NaN; instants in UTC."""

import datetime
import json
import math
from dataclasses import dataclass
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.cli.json_form import as_json, json_text
from service.exit_codes import Exit


@dataclass(frozen=True)
class Thing:
    name: str
    level: tuple[float, ...]
    body: bytes
    at: datetime.datetime


def _refuse(name: str) -> None:
    raise AssertionError(f"{name} is not JSON")


@given(
    st.recursive(
        st.floats() | st.none() | st.text(), lambda each: st.lists(each) | st.dictionaries(st.text(), each)
    )
)
def test_any_value_becomes_json_of_rfc_8259(value: object) -> None:
    json.loads(json_text(value), parse_constant=_refuse)


def test_what_is_no_finite_number_is_null() -> None:
    assert as_json([math.nan, math.inf, -math.inf, 0.5]) == [None, None, None, 0.5]


def test_a_value_object() -> None:
    at = datetime.datetime(2026, 3, 2, 14, 0, tzinfo=ZoneInfo("Europe/Berlin"))
    assert as_json(Thing("a", (1.0, math.nan), b"left out", at)) == {
        "name": "a",
        "level": [1.0, None],
        "at": "2026-03-02T13:00:00Z",
    }


def test_days_stay_days() -> None:
    assert as_json({"at": datetime.date(2026, 3, 2)}) == {"at": "2026-03-02"}


def test_true_is_not_1() -> None:
    assert json_text([True, 1]) == "[\n  true,\n  1\n]"


def test_an_exit_code_is_its_number() -> None:
    assert as_json(Exit.SETTINGS) == 3


def test_an_unknown_kind_is_refused_rather_than_guessed() -> None:
    with pytest.raises(TypeError, match="complex"):
        as_json(complex(1, 2))
