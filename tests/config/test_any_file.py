"""Whatever stands in a file, it is taken or gets faults in words."""

import copy
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from hypothesis import given, settings
from hypothesis import strategies as st

from config.errors import Fault, SettingsFaults
from config.loading import settings_of
from config.settings import Settings

WHOLE = tomllib.loads("""
[service]
database = "counts.sqlite"
zone = "UTC"
good_rounds_address = { env = "A" }
[judgement]
window = 40
[model]
wanders = [[0.1, 1], [0.2, 1]]
dispersions = [1, "poisson"]
[[source]]
name = "plays"
kind = "json"
address = "https://counts.example/"
headers = { Authorization = { env = "A" }, Accept = "text/csv" }
rows = "$[*]"
paging = { next = "$.next" }
leave_out = ["Trailers"]
fields = { at = "$.day", count = "$.plays", split = "$.show", release = "$.id" }
streams = { shape = "release", final = "7d", slate = "S", model = { mean_gap = 9 } }
stream = { "Evening Walks" = { title = "Walks", judgement = { lasting = 4 } } }
[[source]]
name = "letters"
kind = "sql"
address = "sqlite:///letters.sqlite"
query = "select 1"
fields = { at = "day", count = "opens" }
streams = { shape = "calendar", interval = "14 days", absent = "zero", anchor = 2026-03-02 }
[[source]]
name = "table"
kind = "csv"
path = "counts.csv"
fields = { at = "day", count = "opens" }
streams = { shape = "calendar", interval = "day", absent = "zero" }
[[outlet]]
name = "desk"
kind = "webhook"
address = { env = "A" }
secret = { env = "S" }
slates = ["S"]
""")
HIDDEN = "hunter2hunter2"
ENVIRON = {"A": f"https://desk.example/{HIDDEN}", "S": "whsec_" + "h2" * 20}
SECRET_PLACES = {"good_rounds_address", "Authorization", "address", "secret"}


def places(value: Any, loc: tuple[Any, ...] = ()) -> Iterator[tuple[Any, ...]]:
    """Every place of a parsed file."""
    members = (
        value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    )
    for key, member in members:
        yield (*loc, key)
        yield from places(member, (*loc, key))


def changed(loc: tuple[Any, ...], value: Any) -> dict[str, Any]:
    """The whole file with another value at one place."""
    raw = copy.deepcopy(WHOLE)
    within: Any = raw
    for key in loc[:-1]:
        within = within[key]
    within[loc[-1]] = value
    return raw


def outcome(raw: dict[str, Any]) -> Settings | tuple[Fault, ...]:
    """The settings, or the faults."""
    try:
        return settings_of(raw, Path("k.toml"), ENVIRON)
    except SettingsFaults as error:
        return error.faults


scalars = st.one_of(
    st.integers(-(2**63), 2**63 - 1),
    st.floats(),
    st.booleans(),
    st.text(max_size=30),
    st.sampled_from(["hour", "json", "{split}", "{", "$.a", "1h", "", "\0", "\0json", "[key]", "env"]),
    st.dates(),
    st.datetimes(),
    st.times(),
)
keys = st.one_of(
    st.text(max_size=8), st.sampled_from(["env", "file", "kind", "shape", "next", "name", "\0json"])
)
values = st.recursive(
    scalars,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(keys, inner, max_size=3),
    max_leaves=6,
)


def test_the_whole_file_loads() -> None:
    assert len(settings_of(WHOLE, Path("k.toml"), ENVIRON).sources) == 3


@settings(max_examples=600, deadline=None)
@given(st.sampled_from(sorted(places(WHOLE), key=repr)), values)
def test_any_value_anywhere_is_taken_or_gets_faults(loc: tuple[Any, ...], value: Any) -> None:
    found = outcome(changed(loc, value))
    assert HIDDEN not in repr(found)
    if isinstance(found, tuple):
        assert found
        assert all(fault.key and fault.got and fault.needed and "\n" not in str(fault) for fault in found)


def test_a_text_in_any_secret_place_is_never_repeated() -> None:
    for loc in places(WHOLE):
        if loc[-1] in SECRET_PLACES and not (loc[0] == "source" and loc[-1] == "address"):
            for value in (
                HIDDEN,
                [HIDDEN],
                {"env": HIDDEN + "!"},
                {"value": HIDDEN},
                {HIDDEN: {"a": HIDDEN}},
            ):
                found = outcome(changed(loc, value))
                assert isinstance(found, tuple), loc
                assert HIDDEN not in repr(found)
