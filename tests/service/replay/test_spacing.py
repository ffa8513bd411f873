"""The interval from the commonest spacing."""

import datetime
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.replay.errors import NoSpacing
from service.replay.spacing import infer_interval
from service.round.calendar import Interval

DAY = datetime.timedelta(days=1)
BERLIN = ZoneInfo("Europe/Berlin")


def _dates(first: str, step: int, number: int) -> list[datetime.date]:
    start = datetime.date.fromisoformat(first)
    return [start + datetime.timedelta(days=step * each) for each in range(number)]


@pytest.mark.parametrize(
    ("step", "interval"),
    [
        (1, "day"),
        (2, "2 days"),
        (7, "week"),
        (14, "14 days"),
        (28, "28 days"),
        (30, "30 days"),
        (91, "91 days"),
    ],
)
def test_evenly_spaced_days(step: int, interval: str) -> None:
    assert str(infer_interval(_dates("2026-03-04", step, 40))) == interval


@pytest.mark.parametrize("day", [1, 15, 28])
def test_one_day_of_every_month(day: int) -> None:
    dates = [datetime.date(2025 + month // 12, month % 12 + 1, day) for month in range(24)]
    assert infer_interval(dates) == Interval("month")


def test_the_last_day_of_every_month() -> None:
    firsts = [datetime.date(2025 + month // 12, month % 12 + 1, 1) for month in range(1, 24)]
    assert infer_interval([first - DAY for first in firsts]) == Interval("month")


def test_quarters_are_months_with_gaps_of_three() -> None:
    dates = [datetime.date(2020 + quarter // 4, quarter % 4 * 3 + 1, 1) for quarter in range(20)]
    assert infer_interval(dates) == Interval("month")


@pytest.mark.parametrize(("month", "day"), [(1, 1), (7, 1), (12, 31)])
def test_one_day_of_every_year(month: int, day: int) -> None:
    dates = [datetime.date(year, month, day) for year in range(1990, 2020)]
    assert infer_interval(dates) == Interval("year")


def test_holes_do_not_matter_while_they_are_rarer() -> None:
    dates = _dates("2026-01-05", 7, 30)
    del dates[10:20], dates[3]
    assert infer_interval(dates) == Interval("week")


def test_the_order_of_the_rows_does_not_matter() -> None:
    assert infer_interval(_dates("2026-01-05", 7, 30)[::-1]) == Interval("week")


def test_local_midnights_are_days_though_one_has_23_hours() -> None:
    moments = [datetime.datetime(2026, 3, 26 + day, tzinfo=BERLIN) for day in range(6)]
    assert infer_interval(moments) == Interval("day")


@pytest.mark.parametrize("hours", [1, 6, 12])
def test_hours(hours: int) -> None:
    first = datetime.datetime(2026, 3, 2, tzinfo=datetime.UTC)
    assert infer_interval([first + datetime.timedelta(hours=hours * each) for each in range(9)]) == Interval(
        "hour"
    )


def test_too_few_dates() -> None:
    with pytest.raises(NoSpacing, match="--interval"):
        infer_interval(_dates("2026-03-02", 1, 1) * 5)


def test_too_close() -> None:
    first = datetime.datetime(2026, 3, 2, tzinfo=datetime.UTC)
    with pytest.raises(NoSpacing, match="0:05:00"):
        infer_interval([first + datetime.timedelta(minutes=5 * each) for each in range(9)])


@given(
    st.lists(
        st.dates(datetime.date(1900, 1, 1), datetime.date(2100, 1, 1)), min_size=2, max_size=40, unique=True
    )
)
def test_some_interval_is_found_for_any_dates(dates: list[datetime.date]) -> None:
    assert infer_interval(dates).days >= 1
