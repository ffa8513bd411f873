"""The recurring pattern: season gone, break kept, nothing invented, and errors that are what they say."""

import datetime
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from detectors.advance import advance, start
from detectors.cycles import Cycle, every, hours, months, weekdays
from detectors.errors import NotInOrder, UnusableParameter
from detectors.judge import Rule
from detectors.model import Model
from detectors.observation import Observation
from detectors.pattern import Pattern, pattern_exposure, with_pattern
from detectors.pattern_estimate import estimate_pattern
from detectors.simulation import NO_ONE_OFFS, OneOffs, as_observations, simulate

FloatArray = NDArray[np.float64]


def month_starts(year: int, size: int) -> list[datetime.date]:
    return [datetime.date(year + place // 12, place % 12 + 1, 1) for place in range(size)]


def days(size: int) -> list[datetime.date]:
    return [datetime.date(2024, 1, 1) + datetime.timedelta(days=place) for place in range(size)]


def factors(pattern: Pattern, cycle: int = 0) -> FloatArray:
    return np.array([place.factor for place in pattern.cycles[cycle].factors])


def errors(pattern: Pattern, cycle: int = 0) -> FloatArray:
    return np.array([place.relative_sd for place in pattern.cycles[cycle].factors])


def without_season(observations: list[Observation], cycle: Cycle) -> list[Observation]:
    pattern = estimate_pattern(observations, [cycle])
    return with_pattern(observations, [pattern_exposure(pattern, (place,)) for place in cycle.place])


def seasonal_series(
    random: np.random.Generator, *, size: int, spread: float, factor: float, one_offs: OneOffs = NO_ONE_OFFS
) -> tuple[list[Observation], Cycle, FloatArray]:
    """Monthly counts around 400 with a season and a break at two thirds; the season's factors average 1."""
    cycle = months(month_starts(2000, size))
    season = np.exp(random.normal(0.0, spread, 12))
    season /= np.average(season, weights=cycle.weights)
    levels = 400.0 * season[list(cycle.place)]
    levels[2 * size // 3 :] *= factor
    return as_observations(simulate(levels, 40.0, one_offs, random)), cycle, season


def test_a_strong_season_and_one_break_give_that_break_and_no_other() -> None:
    # Ten years, a season of 40 %, a fall to 0.7 at month 80: for the raw counts just another low month.
    found, others, hidden = 0, 0, 0
    for seed in range(4):
        random = np.random.default_rng(seed)
        plain, cycle, _ = seasonal_series(random, size=120, spread=0.4, factor=0.7)
        told = advance(start(Model()), without_season(plain, cycle), Rule()).announcements
        right = [alert for alert in told if abs(alert.start_position - 80) <= 3]
        found += bool(right)
        others += len(told) - len(right)
        raw = advance(start(Model()), plain, Rule()).announcements
        hidden += not any(abs(alert.start_position - 80) <= 3 for alert in raw)
    assert (found, others) == (4, 0)
    # Measured on twelve series: with the pattern 12 found, without it 1.
    assert hidden >= 3


def test_the_season_alone_gives_no_break() -> None:
    alerts = 0
    for seed in range(3):
        plain, cycle, _ = seasonal_series(np.random.default_rng(50 + seed), size=120, spread=0.4, factor=1.0)
        alerts += len(advance(start(Model()), without_season(plain, cycle), Rule()).announcements)
    assert alerts == 0


def test_a_flat_series_gets_factors_near_one() -> None:
    largest = []
    for seed in range(12):
        random = np.random.default_rng(seed)
        flat = simulate(np.full(120, 100.0), 10.0, NO_ONE_OFFS, random)
        pattern = estimate_pattern(as_observations(flat), [months(month_starts(2000, 120))])
        largest.append(np.abs(np.log(factors(pattern))).max())
    # Unshrunk, the largest of twelve means of ten counts, each of 33 %, lies near 0.2. Measured on 20 series:
    # median 0.012, two thirds below 0.025, largest 0.145.
    assert np.median(largest) < 0.03
    assert max(largest) < 0.2


def test_a_level_that_moves_is_not_a_season() -> None:
    # Four years that wear down by half, and four that wander 5 % a month.
    largest = []
    for seed in range(5):
        random = np.random.default_rng(seed)
        wearing = 500.0 * 0.5 ** (np.arange(48) / 48)
        walking = 500.0 * np.exp(np.cumsum(random.normal(0.0, 0.05, 48)))
        for levels in (wearing, walking):
            counts = simulate(levels, 50.0, NO_ONE_OFFS, random)
            pattern = estimate_pattern(as_observations(counts), [months(month_starts(2000, 48))])
            largest.append(np.abs(np.log(factors(pattern))).max())
    # Measured on 20 series: median 0.007, largest 0.039.
    assert np.median(largest) < 0.03
    assert max(largest) < 0.1


@pytest.mark.parametrize("one_offs", [NO_ONE_OFFS, OneOffs(0.03)])
def test_the_errors_of_the_factors_are_what_they_say(one_offs: OneOffs) -> None:
    scaled, apart = [], []
    for seed in range(6):
        random = np.random.default_rng(seed)
        plain, cycle, season = seasonal_series(random, size=96, spread=0.2, factor=0.6, one_offs=one_offs)
        pattern = estimate_pattern(plain, [cycle])
        apart.append(np.log(factors(pattern) / season))
        scaled.append(apart[-1] / errors(pattern))
    # Root mean square of scaled errors, measured on 15 series: 1.15 with and without one-offs. The stated
    # errors are some 15 % small, since dispersion and wander are taken at their best values.
    assert np.sqrt(np.mean(np.square(scaled))) == pytest.approx(1.0, abs=0.3)
    # Eight counts of 17 % a factor: 0.06. One-offs of 5 to 50 times leave that almost as it is.
    assert np.sqrt(np.mean(np.square(apart))) < 0.08


def test_weekdays_months_and_known_days_together() -> None:
    size = 800
    calendar_days = days(size)
    week = np.array([1.1, 1.05, 1.0, 1.0, 0.95, 0.7, 0.6]) / (6.4 / 7)
    year = 1.0 + 0.3 * np.sin(np.arange(12) * math.pi / 6)
    year /= np.average(year, weights=months(calendar_days).weights)
    known = [
        "bank holiday" if (day.month, day.day) in {(1, 1), (5, 1), (12, 25), (12, 26)} else None
        for day in calendar_days
    ]
    levels = (
        300.0 * week[[day.weekday() for day in calendar_days]] * year[[d.month - 1 for d in calendar_days]]
    )
    levels *= np.where([kind is not None for kind in known], 0.4, 1.0)
    counts = simulate(levels, 20.0, OneOffs(0.02), np.random.default_rng(2))
    cycles = [weekdays(calendar_days), months(calendar_days)]
    pattern = estimate_pattern(as_observations(counts), cycles, known_days=known, fewest_turns=2)
    assert factors(pattern, 0) == pytest.approx(week, rel=0.06)
    assert factors(pattern, 1) == pytest.approx(year, rel=0.09)
    (holiday,) = pattern.known
    assert (holiday.label, holiday.counted) == ("bank holiday", 9)
    assert abs(math.log(holiday.factor / 0.4)) < 2.5 * holiday.relative_sd < 0.3
    # A Saturday that is a bank holiday; and a kind of day never counted before, which might be anything.
    both = pattern_exposure(pattern, (5, 11), "bank holiday")
    assert both.factor == pytest.approx(factors(pattern)[5] * factors(pattern, 1)[11] * holiday.factor)
    unseen = pattern_exposure(pattern, (5, 11), "election")
    assert unseen.relative_sd >= 0.3


def test_a_known_day_is_not_missed_and_not_invented() -> None:
    size = 120
    known = ["fair" if place in (40, 80, 110) else None for place in range(size)]
    flat = simulate(np.full(size, 200.0), 20.0, NO_ONE_OFFS, np.random.default_rng(1))
    plain = estimate_pattern(as_observations(flat), [], known_days=known).known[0]
    assert abs(math.log(plain.factor)) < 0.1
    flat[[40, 80, 110]] *= 3
    (fair,) = estimate_pattern(as_observations(flat), [], known_days=known).known
    assert fair.factor == pytest.approx(3.0, rel=0.3)


def test_few_turns_or_few_counts_give_ones_and_say_why() -> None:
    year = month_starts(2000, 24)
    short = estimate_pattern([Observation(k, 100) for k in range(24)], [months(year)])
    assert factors(short).tolist() == [1.0] * 12
    assert short.cycles[0].why_not == "its places were counted in 2 turns; 3 are needed"
    few = estimate_pattern([Observation(k, k % 2) for k in range(60)], [weekdays(days(60))])
    assert few.cycles[0].why_not == "30 were counted in all; 50 are needed"
    assert pattern_exposure(few, (3,)).relative_sd == 0.0
    one_day = [Observation(k, 100 if k % 7 == 0 else None) for k in range(60)]
    alone = estimate_pattern(one_day, [weekdays(days(60))])
    assert alone.cycles[0].why_not == "counts lie at 1 of 7 places of the cycle"


def test_a_stream_without_weekends_has_a_pattern_of_five_days() -> None:
    calendar_days = days(140)
    counts = [None if day.weekday() > 4 else (240 if day.weekday() == 0 else 120) for day in calendar_days]
    observations = [Observation(k, count) for k, count in enumerate(counts)]
    pattern = estimate_pattern(observations, [weekdays(calendar_days)])
    found = factors(pattern)
    assert found[0] / found[1:5] == pytest.approx([2.0] * 4, rel=0.1)
    assert [place.counted for place in pattern.cycles[0].factors] == [20, 20, 20, 20, 20, 0, 0]
    # Nothing is known of Saturdays, and that is said.
    assert errors(pattern)[5] > 0.2 > errors(pattern)[0]


def test_exposure_stands_for_itself() -> None:
    # Half the exposure on every third Monday: no pattern of the stream.
    random = np.random.default_rng(6)
    exposure = np.where(np.arange(210) % 21 == 0, 0.5, 1.0)
    counts = simulate(400.0 * exposure, 100.0, NO_ONE_OFFS, random)
    observations = [
        Observation(k, int(n), float(e)) for k, (n, e) in enumerate(zip(counts, exposure, strict=True))
    ]
    pattern = estimate_pattern(observations, [every(21, range(210))])
    assert factors(pattern) == pytest.approx(np.ones(21), abs=0.05)


odd_streams = st.one_of(
    st.lists(st.one_of(st.none(), st.integers(0, 20)), min_size=0, max_size=40),
    st.lists(st.one_of(st.none(), st.integers(0, 2**53)), min_size=0, max_size=40),
    st.tuples(st.integers(0, 10**6), st.integers(0, 2**53), st.integers(1, 39)).map(
        lambda t: [t[0]] * t[2] + [t[1]] * (40 - t[2])
    ),
)


@given(odd_streams, st.booleans())
@settings(max_examples=25, deadline=None)
def test_any_stream_gets_numbers_that_can_be_used(counts: list[int | None], fair: bool) -> None:
    size = len(counts)
    observations = [Observation(k, count) for k, count in enumerate(counts)]
    known = ["fair" if k % 9 == 4 and fair else None for k in range(size)]
    cycles = [every(4, range(size)), weekdays(days(size))]
    pattern = estimate_pattern(observations, cycles, known_days=known)
    exposures = [pattern_exposure(pattern, (k % 4, days(size)[k].weekday()), known[k]) for k in range(size)]
    for observation in with_pattern(observations, exposures):
        assert 0.0 < observation.exposure < math.inf
        assert 0.0 <= observation.relative_sd < math.inf
    for cycle, place in zip(pattern.cycles, cycles, strict=True):
        mean = np.average([factor.factor for factor in cycle.factors], weights=place.weights)
        assert mean == pytest.approx(1.0, abs=1e-9)


@given(st.integers(1, 1000))
@settings(max_examples=5, deadline=None)
def test_factors_do_not_depend_on_the_level(unit: int) -> None:
    counts = simulate(np.tile([900.0, 1000.0, 1300.0], 20), math.inf, NO_ONE_OFFS, np.random.default_rng(3))
    cycle = every(3, range(60))
    one = estimate_pattern(as_observations(counts), [cycle])
    observations = [Observation(k, int(count), 1.0 / unit) for k, count in enumerate(counts)]
    assert factors(estimate_pattern(observations, [cycle])) == pytest.approx(factors(one), rel=1e-4)


def test_what_does_not_fit_gets_a_sentence() -> None:
    observations = [Observation(k, 5) for k in range(20)]
    with pytest.raises(UnusableParameter, match="20 places long"):
        estimate_pattern(observations, [weekdays(days(19))])
    with pytest.raises(UnusableParameter, match="20 entries long"):
        estimate_pattern(observations, [], known_days=[None])
    with pytest.raises(UnusableParameter, match="fewest_turns"):
        estimate_pattern(observations, [], fewest_turns=1)
    with pytest.raises(NotInOrder):
        estimate_pattern([Observation(3, 1), Observation(3, 1)], [])
    with pytest.raises(UnusableParameter, match="two places"):
        Cycle("odd", ("one",), (1.0,), (), ())
    with pytest.raises(UnusableParameter, match="place"):
        Cycle("odd", ("one", "two"), (1.0, 1.0), (2,), (0,))


def test_cycles_of_the_calendar() -> None:
    # ISO week 1 of 2026 runs from Monday 29 December 2025 to Sunday 4 January.
    week = weekdays([datetime.date(2025, 12, 28), datetime.date(2025, 12, 29), datetime.date(2026, 1, 4)])
    assert week.place == (6, 0, 6)
    assert week.turn[0] + 1 == week.turn[1] == week.turn[2]
    instants = [datetime.datetime(2026, 3, 2, hour, tzinfo=datetime.UTC) for hour in (0, 23)]
    assert hours(instants).place == (0, 23)
    assert every(4, [-1, 0]).place == (3, 0)
