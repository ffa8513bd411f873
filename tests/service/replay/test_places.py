"""Which place each row gets."""

import datetime
from itertools import pairwise
from zoneinfo import ZoneInfo

import pytest

from service.replay.errors import SamePlace
from service.replay.places import place_intervals, place_releases
from service.replay.table import Entry
from service.round.calendar import Interval

DAY, WEEK, MONTH, HOUR = Interval("day"), Interval("week"), Interval("month"), Interval("hour")


def _entries(*ats: str) -> list[Entry]:
    read = (datetime.datetime.fromisoformat if "T" in at else datetime.date.fromisoformat for at in ats)
    return [
        Entry(index, each(at), 10, f"r{index}", 1.0)
        for index, (each, at) in enumerate(zip(read, ats, strict=True))
    ]


def _gaps(positions: list[int]) -> list[int]:
    return [later - earlier for earlier, later in pairwise(positions)]


def test_a_hiatus_is_a_gap_of_its_length() -> None:
    placed = place_intervals(_entries("2026-01-05", "2026-01-12", "2026-03-16"), WEEK, None)
    assert _gaps([one.observation.position for one in placed]) == [1, 9]


def test_rows_are_taken_by_date_and_keep_their_index() -> None:
    placed = place_intervals(_entries("2026-01-19", "2026-01-05", "2026-01-12"), WEEK, None)
    assert [one.index for one in placed] == [1, 2, 0]


def test_two_rows_of_one_interval_are_refused() -> None:
    with pytest.raises(SamePlace) as caught:
        place_intervals(_entries("2026-01-05", "2026-02-01", "2026-01-20"), MONTH, None)
    assert (caught.value.first, caught.value.second) == (0, 2)
    assert "2026-01" in str(caught.value)


def test_without_a_zone_the_written_date_counts() -> None:
    # London's local midnights over the change of clocks: in UTC two of them fall on one day.
    entries = _entries("2026-03-28T00:00+00:00", "2026-03-29T00:00+00:00", "2026-03-30T00:00+01:00")
    assert _gaps([one.observation.position for one in place_intervals(entries, DAY, None)]) == [1, 1]


def test_with_a_zone_the_date_there_counts() -> None:
    # 23:30 in UTC is the day after in Berlin, so the second row is five days after the first.
    entries = _entries("2026-03-02", "2026-03-06T23:30+00:00")
    placed = place_intervals(entries, DAY, ZoneInfo("Europe/Berlin"))
    assert _gaps([one.observation.position for one in placed]) == [5]
    unzoned = place_intervals(entries, DAY, None)
    assert _gaps([one.observation.position for one in unzoned]) == [4]


def test_the_hour_that_comes_twice_is_two_hours() -> None:
    entries = _entries("2026-10-25T02:00+02:00", "2026-10-25T02:00+01:00")
    assert _gaps([one.observation.position for one in place_intervals(entries, HOUR, None)]) == [1]


def test_several_days_are_counted_from_the_first_row() -> None:
    entries = _entries("2026-01-07", "2026-01-21", "2026-02-18")
    placed = place_intervals(entries, Interval("day", 14), None)
    assert [one.observation.position for one in placed] == [0, 1, 3]


def test_releases_are_numbered_in_the_order_in_which_they_came_out() -> None:
    placed = place_releases(_entries("2026-01-19", "2026-01-05", "2026-01-05", "2026-05-01T08:00+00:00"))
    assert [(one.index, one.observation.position) for one in placed] == [(1, 0), (2, 1), (0, 2), (3, 3)]


def test_a_release_that_comes_twice_is_refused() -> None:
    entries = [Entry(index, datetime.date(2026, 1, 1 + index), 1, "same", 1.0) for index in range(2)]
    with pytest.raises(SamePlace, match="same"):
        place_releases(entries)
