"""The story's counts: invented, the same every time, and telling what the demo says that they tell."""

import datetime
import statistics

import pytest
from scipy import stats

from config.judging import Judgement
from config.judging import Model as WrittenModel
from detectors.advance import Advanced, advance, start
from detectors.observation import Observation
from service.demo.story import (
    FALL,
    FALLING_SHOW,
    HISTORY_DAYS,
    HIT,
    HIT_SHOW,
    SHOWS,
    Almanac,
    Show,
    count_of,
    level_of,
)
from service.wiring import model_of, rule_of

DAYS = HISTORY_DAYS + 65
FIRST_DAY = [452, 2283, 848, 2068, 388, 4772]


@pytest.fixture(scope="module")
def told() -> dict[str, Advanced]:
    """What the detector makes of every show with the default settings."""
    model, rule = model_of(WrittenModel(), Judgement()), rule_of(Judgement())
    return {show.name: advance(start(model), _observations(show), rule) for show in SHOWS}


def _observations(show: Show) -> list[Observation]:
    return [Observation(day, count_of(show, day)) for day in range(DAYS)]


def test_a_count_is_the_same_whenever_it_is_asked_for() -> None:
    forwards = [count_of(HIT_SHOW, day) for day in range(DAYS)]
    backwards = [count_of(HIT_SHOW, day) for day in reversed(range(DAYS))]
    assert forwards == backwards[::-1]
    # As drawn when the story was written: another version of a library must not tell another one.
    assert [count_of(show, 0) for show in SHOWS] == FIRST_DAY
    assert count_of(HIT_SHOW, HIT.day) == 22_500


@pytest.mark.parametrize("show", SHOWS, ids=lambda show: show.name)
def test_counts_are_negative_binomial_around_the_level(show: Show) -> None:
    draws = [count_of(show, 3, seed=seed) for seed in range(2000)]
    mean, variance = show.level, show.level + show.level**2 / show.dispersion
    assert statistics.fmean(draws) == pytest.approx(mean, abs=4 * (variance / len(draws)) ** 0.5)
    share = show.dispersion / (show.dispersion + mean)
    # A discrete distribution makes this test only milder.
    assert stats.kstest(draws, stats.nbinom(show.dispersion, share).cdf).pvalue > 1e-4


def test_the_hit_is_a_runaway_and_the_fall_is_lasting() -> None:
    usual = statistics.median(count_of(HIT_SHOW, day) for day in range(HIT.day))
    assert 20 <= count_of(HIT_SHOW, HIT.day) / usual <= 40
    assert level_of(FALLING_SHOW, FALL.day - 1) == FALLING_SHOW.level
    assert level_of(FALLING_SHOW, DAYS) == level_of(FALLING_SHOW, FALL.day) == 0.55 * FALLING_SHOW.level
    assert HISTORY_DAYS < HIT.day < FALL.day


def test_since_the_first_poll_only_the_fall_rings(told: dict[str, Advanced]) -> None:
    live = {
        name: [one for one in done.announcements if one.position >= HISTORY_DAYS]
        for name, done in told.items()
    }
    assert {name: len(ones) for name, ones in live.items() if ones} == {FALLING_SHOW.name: 1}
    (fall,) = live[FALLING_SHOW.name]
    assert FALL.day in fall.region
    assert FALL.day + 2 <= fall.position <= FALL.day + 7


def test_the_hit_is_taken_for_a_one_off(told: dict[str, Advanced]) -> None:
    said = told[HIT_SHOW.name].posteriors[HIT.day]
    assert said is not None
    assert said.one_off > 0.8
    assert said.recent_shift < 0.2


def test_history_holds_the_shifts_that_were_put_there(told: dict[str, Advanced]) -> None:
    found = {
        name: [one.start_position for one in done.announcements if one.position < HISTORY_DAYS]
        for name, done in told.items()
    }
    assert {name: starts for name, starts in found.items() if starts} == {
        show.name: [pytest.approx(show.turns[0].day, abs=2)]
        for show in SHOWS
        if show.turns and show is not FALLING_SHOW
    }


def test_a_day_is_over_at_midnight() -> None:
    almanac = Almanac(datetime.date(2026, 3, 1))
    assert almanac.date(31) == datetime.date(2026, 4, 1)
    assert almanac.days_over(datetime.datetime(2026, 3, 2, 23, 59, tzinfo=datetime.UTC)) == 1
    assert almanac.days_over(datetime.datetime(2026, 3, 3, tzinfo=datetime.UTC)) == 2
