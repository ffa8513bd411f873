"""What one count covers, read off two dates."""

import datetime
from collections.abc import Callable

import pytest

from service.tell.story import At, Marker
from service.tell.unit import unit_of

DAY = datetime.date


def markers(first: At, last: At, places: int) -> tuple[Marker, Marker]:
    return Marker("a", first, None, 10), Marker("b", last, None, 10 + places)


@pytest.mark.parametrize(
    ("first", "last", "places", "unit"),
    [
        (DAY(2026, 3, 2), DAY(2026, 3, 5), 3, "day"),
        (DAY(2026, 3, 2), DAY(2026, 3, 16), 2, "week"),
        (DAY(2026, 3, 2), DAY(2026, 3, 30), 2, "14 days"),
        (DAY(2026, 1, 1), DAY(2026, 3, 1), 2, "month"),
        (DAY(2026, 2, 1), DAY(2026, 3, 1), 1, "month"),
        (DAY(2026, 2, 1), DAY(2026, 3, 1), 4, "week"),
        (DAY(1891, 1, 1), DAY(1894, 1, 1), 3, "year"),
        (DAY(2026, 3, 2), DAY(2026, 3, 9), 2, None),
        (DAY(2026, 3, 2), DAY(2026, 3, 2), 1, None),
        (DAY(2026, 3, 2), DAY(2026, 3, 2), 0, None),
    ],
)
def test_days(first: At, last: At, places: int, unit: str | None) -> None:
    assert unit_of(markers(first, last, places)) == unit
    assert unit_of(markers(first, last, places)[::-1]) == unit


def test_hours_across_a_change_of_the_clocks() -> None:
    before = datetime.datetime.fromisoformat("2026-03-29T01:00+01:00")
    after = datetime.datetime.fromisoformat("2026-03-29T03:00+02:00")
    assert unit_of(markers(before, after, 1)) == "hour"
    assert unit_of(markers(before, after, 2)) is None
    assert unit_of(markers(before, DAY(2026, 3, 30), 2)) is None


def test_one_marker_tells_nothing(weeks: Callable[[int], Marker]) -> None:
    assert unit_of([weeks(0)]) is None
    assert unit_of([]) is None
