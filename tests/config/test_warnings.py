"""What is odd about settings that can be used all the same."""

from collections.abc import Callable

from config.settings import Settings

SOURCE = """
[[source]]
name = "plays"
kind = "csv"
path = "counts.csv"
[source.fields]
at = "day"
count = "plays"
split = "show"
[source.streams]
shape = "calendar"
interval = "day"
absent = "zero"
slate = "Lampwick House"
[source.stream."Evening Walks"]
slate = "Mornings"
"""
OUTLET = '[[outlet]]\nname = "desk"\nkind = "webhook"\naddress = { env = "A" }\nsecret = { env = "S" }\n'
ENVIRON = {"A": "https://desk.example/in", "S": "whsec_" + "A" * 32}

Load = Callable[..., Settings]


def test_without_an_outlet_nobody_is_told(load: Load) -> None:
    assert load(SOURCE).warnings == (
        "There is no outlet: shifts are recorded, and nobody is told. Add an [[outlet]].",
    )


def test_an_outlet_for_all_leaves_nothing_to_warn_of(load: Load) -> None:
    assert load(SOURCE + OUTLET, ENVIRON).warnings == ()


def test_a_slate_that_no_outlet_takes_is_warned_of(load: Load) -> None:
    assert load(SOURCE + OUTLET + 'slates = ["Lampwick House"]', ENVIRON).warnings == (
        'Source "plays": no outlet takes the streams of slate "Mornings"; nobody is told of them.',
    )
    assert load(SOURCE + OUTLET + 'slates = ["Lampwick House", "Mornings"]', ENVIRON).warnings == ()
