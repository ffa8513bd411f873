"""Running totals: nothing is lost or made up, falls are listed, and gaps say what they cover."""

import itertools
import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from detectors.errors import UnusableObservation, UnusableParameter
from detectors.observation import Observation
from detectors.running_totals import FallenTotal, Increments, TotalReading, Unplaced, increments


def read(*readings: tuple[float, int]) -> list[TotalReading]:
    return [TotalReading(at, total) for at, total in readings]


def told(found: Increments) -> list[tuple[int, int | None, float]]:
    return [(count.position, count.count, round(count.exposure, 9)) for count in found.counts]


def test_one_reading_an_interval() -> None:
    assert told(increments(read((3.0, 10), (4.0, 25), (5.0, 25)))) == [(3, 15, 1.0), (4, 0, 1.0)]


def test_read_once_a_day_in_the_morning() -> None:
    # From six in the morning to six: three quarters of that time lie in the day before.
    assert told(increments(read((3.25, 10), (4.25, 25), (5.25, 45)))) == [(3, 15, 1.0), (4, 20, 1.0)]


def test_hourly_readings_add_up_to_days() -> None:
    hours = [TotalReading(hour / 24, 7 * hour) for hour in range(24 * 3 + 1)]
    assert told(increments(hours)) == [(0, 168, 1.0), (1, 168, 1.0), (2, 168, 1.0)]


def test_an_interval_that_has_just_begun_waits_and_one_half_over_is_told_as_such() -> None:
    begun = increments(read((0.0, 0), (1.0, 10), (1.4, 15)))
    assert told(begun) == [(0, 10, 1.0)]
    assert begun.unplaced == (Unplaced(1.0, 1.4, 5),)
    assert told(increments(read((0.0, 0), (1.0, 10), (1.6, 15)))) == [(0, 10, 1.0), (1, 5, 0.6)]


def test_a_fall_is_listed_with_place_and_size_and_makes_no_count() -> None:
    found = increments(read((0.0, 100), (1.0, 130), (2.0, 90), (3.0, 125)))
    assert told(found) == [(0, 30, 1.0), (1, None, 0.0), (2, 35, 1.0)]
    assert found.fallen == (FallenTotal(2, 1.0, 2.0, 130, 90),)
    assert found.fallen[0].size == 40


def test_a_fall_within_a_day_takes_only_its_own_hours() -> None:
    hours = [TotalReading(hour / 24, 1000 + 5 * hour - (700 if hour >= 30 else 0)) for hour in range(49)]
    found = increments(hours)
    assert told(found) == [(0, 120, 1.0), (1, 115, round(23 / 24, 9))]
    assert [(fall.position, fall.size) for fall in found.fallen] == [(1, 695)]


def test_a_total_that_begins_again_at_nothing() -> None:
    found = increments(read((0.0, 900), (1.0, 950), (2.0, 20), (3.0, 60)))
    assert told(found) == [(0, 50, 1.0), (1, None, 0.0), (2, 40, 1.0)]
    assert found.fallen[0].size == 930


def test_a_gap_of_some_intervals_is_one_count_with_their_exposure() -> None:
    found = increments(read((0.0, 0), (1.0, 10), (4.0, 46), (5.0, 57)))
    assert told(found) == [(0, 10, 1.0), (1, None, 0.0), (2, 36, 3.0), (3, None, 0.0), (4, 11, 1.0)]
    assert (found.counts[2].covers_from, found.counts[2].covers_to) == (1.0, 4.0)


def test_a_longer_gap_is_missing_and_its_rise_is_listed() -> None:
    found = increments(read((0.0, 0), (1.0, 10), (5.0, 60), (6.0, 71)))
    assert told(found) == [(0, 10, 1.0), *((day, None, 0.0) for day in (1, 2, 3, 4)), (5, 11, 1.0)]
    assert found.unplaced == (Unplaced(1.0, 5.0, 50),)
    told_whole = increments(read((0.0, 0), (1.0, 10), (5.0, 60)), longest_span=4.0)
    assert told(told_whole)[3] == (3, 50, 4.0)


@pytest.mark.parametrize("readings", [[], [(2.0, 7)]])
def test_fewer_than_two_readings_tell_nothing(readings: list[tuple[float, int]]) -> None:
    assert increments(read(*readings)) == Increments((), (), ())


def test_bad_readings_get_a_sentence() -> None:
    with pytest.raises(UnusableObservation, match="at must be after the reading before it"):
        increments(read((1.0, 5), (1.0, 6)))
    with pytest.raises(UnusableObservation, match="total must be at least 0"):
        TotalReading(0.0, -1)
    with pytest.raises(UnusableObservation, match="at must be"):
        TotalReading(math.nan, 1)
    with pytest.raises(UnusableParameter):
        increments([], longest_span=0.0)
    with pytest.raises(UnusableParameter):
        increments([], least_covered=2.0)
    with pytest.raises(UnusableObservation, match="1000000 intervals"):
        increments(read((0.0, 0), (1.0, 1), (1e12, 2), (1e12 + 1, 3)))


@st.composite
def totals(draw: st.DrawFn) -> list[TotalReading]:
    gaps = draw(st.lists(st.sampled_from([0.05, 0.3, 1.0, 1.2, 2.5, 6.0]), max_size=25))
    values = draw(st.lists(st.integers(0, 10**6), min_size=len(gaps) + 1, max_size=len(gaps) + 1))
    start = draw(st.floats(-50.0, 50.0))
    places = itertools.accumulate(gaps, initial=start)
    return [TotalReading(at, total) for at, total in zip(places, values, strict=True)]


@given(totals(), st.floats(0.5, 5.0), st.floats(0.0, 1.0))
@settings(max_examples=150, deadline=None)
def test_nothing_is_lost_and_nothing_negative(
    readings: list[TotalReading], longest: float, least: float
) -> None:
    found = increments(readings, longest_span=longest, least_covered=least)
    counted = sum(count.count or 0 for count in found.counts)
    change = counted + sum(rise.count for rise in found.unplaced) - sum(fall.size for fall in found.fallen)
    assert change == readings[-1].total - readings[0].total
    positions = [count.position for count in found.counts]
    assert positions == list(range(positions[0], positions[0] + len(positions))) if positions else True
    for count in found.counts:
        if count.count is None:
            assert count.exposure == 0.0
        else:
            assert count.exposure >= least
            assert count.covers_to > count.covers_from
            if count.exposure > 0.0:
                Observation(count.position, count.count, count.exposure)
    assert all(fall.size > 0 for fall in found.fallen)


@given(st.lists(st.integers(0, 1000), min_size=1, max_size=30), st.integers(-5, 5))
@settings(max_examples=50, deadline=None)
def test_totals_of_counts_give_the_counts_back(counts: list[int], first: int) -> None:
    readings = [
        TotalReading(float(first + k), total)
        for k, total in enumerate(itertools.accumulate(counts, initial=0))
    ]
    assert told(increments(readings)) == [(first + k, count, 1.0) for k, count in enumerate(counts)]
