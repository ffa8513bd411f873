"""Durations, sizes, intervals and zones as people write them."""

import datetime

import pytest
from hypothesis import given
from hypothesis import strategies as st

from config.calendar_words import is_zone, plain_interval
from config.durations import parse_duration, parse_size, write_duration
from service.round.calendar import UnusableInterval, parse_interval


@pytest.mark.parametrize(
    ("text", "parts"),
    [
        ("0s", {"seconds": 0}),
        ("90s", {"seconds": 90}),
        ("15m", {"minutes": 15}),
        ("1h", {"hours": 1}),
        ("7d", {"days": 7}),
        ("2w", {"weeks": 2}),
    ],
)
def test_durations(text: str, parts: dict[str, int]) -> None:
    assert parse_duration(text) == datetime.timedelta(**parts)


@pytest.mark.parametrize("text", ["", "1", "h", "1 h", "1H", "-1h", "1.5h", "1h30m", "٣h", "99999999s"])
def test_what_is_no_duration(text: str) -> None:
    assert parse_duration(text) is None


@given(st.integers(min_value=0, max_value=9_999_999))
def test_a_written_duration_reads_back(seconds: int) -> None:
    value = datetime.timedelta(seconds=seconds)
    assert parse_duration(write_duration(value)) == value


@pytest.mark.parametrize(
    ("text", "size"), [("1kB", 1_000), ("25MB", 25_000_000), ("1GB", 10**9), ("1kb", None)]
)
def test_sizes(text: str, size: int | None) -> None:
    assert parse_size(text) == size


@pytest.mark.parametrize(
    ("text", "plain"),
    [
        ("hour", "hour"),
        ("Day", "day"),
        (" week ", "week"),
        ("month", "month"),
        ("year", "year"),
        ("1 day", "day"),
        ("14  days", "14 days"),
        ("7 days", "7 days"),
        ("3660 days", "3660 days"),
    ],
)
def test_intervals_have_one_way_to_be_written(text: str, plain: str) -> None:
    assert plain_interval(text) == plain
    assert parse_interval(text) == parse_interval(plain)


@pytest.mark.parametrize(
    "text", ["", "days", "0 days", "3661 days", "1.5 days", "2 weeks", "-1 day", "hourly"]
)
def test_what_is_no_interval_here_is_none_where_intervals_are_counted(text: str) -> None:
    assert plain_interval(text) is None
    with pytest.raises(UnusableInterval):
        parse_interval(text)


def test_zones() -> None:
    assert is_zone("UTC")
    assert is_zone("Europe/Lisbon")
    assert not any(is_zone(name) for name in ("", "Europe", "Lisbon", "../UTC", "/etc/passwd", "UTC\0"))
