"""Streams that no source should send and some will: no exception, no warning, and figures that make sense.

Warnings are errors in this test suite: an overflow, a division by zero or a NaN of numpy fails a test here.
"""

import math

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from detectors.advance import advance, start
from detectors.judge import Rule
from detectors.model import Model
from detectors.observation import LARGEST_COUNT, Observation
from detectors.posterior import Announcement, Posterior

DEFAULTS = Model()
FEW = Model(dispersions=(2.0, 30.0, 512.0), wanders=((0.0, 1.0), (0.05, 0.5)))
"""Fewer pairs, where a stream of counts in the millions would take long under the defaults."""


def folded(observations: list[Observation], model: Model = DEFAULTS) -> list[Posterior]:
    """The posteriors, each of them looked at."""
    advanced = advance(start(model), observations, Rule())
    assert [p is None for p in advanced.posteriors] == [o.count is None for o in observations]
    posteriors = [p for p in advanced.posteriors if p is not None]
    for number, posterior in enumerate(posteriors, start=1):
        assert posterior.counted == number
        makes_sense(posterior)
    for announcement in advanced.announcements:
        announcement_makes_sense(announcement)
    return posteriors


def plain(counts: list[int]) -> list[Observation]:
    return [Observation(i, x) for i, x in enumerate(counts)]


def makes_sense(said: Posterior) -> None:
    level = (said.level.low, said.level.mid, said.level.high)
    assert all(math.isfinite(value) and value > 0.0 for value in level)
    assert level[0] <= level[1] <= level[2]
    below, up_to = said.pit
    assert 0.0 <= below <= up_to <= 1.0
    assert math.isfinite(said.log_predictive)
    assert said.log_predictive <= 1e-9
    assert 0.0 <= said.one_off <= 1.0
    assert 0.0 <= said.recent_shift <= 1.0
    for weighted in (said.dispersion, said.wander):
        adds_up(weighted.probability)
        assert list(weighted.value) == sorted(set(weighted.value))
    run_lengths_make_sense(said)


def run_lengths_make_sense(said: Posterior) -> None:
    lengths = said.run_lengths
    adds_up(lengths.probability)
    assert lengths.holds_first_run
    assert lengths.longest[-1] == said.counted
    # Every run length from 1 to the number of counts is in exactly one group.
    assert lengths.shortest[0] == 1
    for before, after in zip(lengths.longest[:-1], lengths.shortest[1:], strict=True):
        assert after == before + 1
    assert all(short <= long for short, long in zip(lengths.shortest, lengths.longest, strict=True))
    assert 1 <= said.run_length_mode <= said.counted


def announcement_makes_sense(told: Announcement) -> None:
    assert 0.0 < told.probability <= 1.0
    assert told.start_position in told.region
    assert told.start_position <= told.position
    for level in (told.level_before, told.level_after):
        assert 0.0 < level.low <= level.mid <= level.high < math.inf


def adds_up(probability: tuple[float, ...]) -> None:
    assert all(p >= 0.0 for p in probability)
    assert math.fsum(probability) == pytest.approx(1.0, abs=1e-9)


# Counts


def test_all_zeros() -> None:
    # The lower end of the level is the grid's; the upper end must fall as zeros come in.
    posteriors = folded(plain([0] * 120))
    assert posteriors[-1].level.high < 0.2
    assert posteriors[-1].level.high < posteriors[10].level.high
    assert max(p.one_off for p in posteriors[20:]) < 0.1


@pytest.mark.parametrize("count", [1, 3, 250])
def test_constant(count: int) -> None:
    last = folded(plain([count] * 60))[-1]
    assert last.level.mid == pytest.approx(count, rel=0.15)
    assert last.one_off < 0.05
    # Counts that do not vary at all leave no room for much dispersion.
    assert last.dispersion.value[-1] >= 512.0


@pytest.mark.parametrize("count", [10**6, 10**12, 10**15, LARGEST_COUNT])
def test_constant_and_large(count: int) -> None:
    last = folded(plain([count] * 40), FEW)[-1]
    assert last.level.mid == pytest.approx(count, rel=0.15)
    assert last.dispersion.value == (512.0,)


@pytest.mark.parametrize("place", [0, 1, 12, 30])
def test_one_count_of_2_to_the_53(place: int) -> None:
    counts = np.random.default_rng(1).poisson(30.0, 40).tolist()
    counts[place] = LARGEST_COUNT
    last = folded(plain(counts), FEW)[-1]
    assert last.level.mid == pytest.approx(30.0, rel=0.2)


@pytest.mark.parametrize("count", [0, 1, 77, 10**9, LARGEST_COUNT])
def test_a_single_count(count: int) -> None:
    (only,) = folded(plain([count]), FEW if count > 10**6 else DEFAULTS)
    assert only.run_lengths.probability == (1.0,)
    assert only.run_length_mode == 1


@pytest.mark.parametrize("dispersion", [3.0, 50.0])
@pytest.mark.parametrize(("before", "after"), [(10.0, 10_000.0), (100.0, 100_000.0), (50_000.0, 50.0)])
@pytest.mark.parametrize("first", [15, 80])
def test_thousand_fold_jump(first: int, before: float, after: float, dispersion: float) -> None:
    rng = np.random.default_rng([first, int(before)])
    level = np.repeat([before, after], [first, 25])
    counts = rng.poisson(level * rng.gamma(dispersion, 1.0 / dispersion, level.size)).tolist()
    advanced = advance(start(FEW), plain(counts), Rule())
    assert [a.start_position for a in advanced.announcements] == [first]
    last = folded(plain(counts), FEW)[-1]
    # The level, the truth within 30 %; a bound on what dispersion 3 itself leaves open after 25 counts.
    assert last.level.mid == pytest.approx(after, rel=0.3)
    # The counts after it are ordinary ones.
    assert last.one_off < 0.5


def test_alternating_nothing_and_a_million() -> None:
    last = folded(plain([0, 1_000_000] * 40))[-1]
    assert last.dispersion.value[0] == 0.5
    assert last.level.high < 1e7


def test_growing_without_end() -> None:
    last = folded(plain([int(1.8**i) for i in range(60)]), FEW)[-1]
    assert last.level.mid > 1e12


@given(st.lists(st.one_of(st.none(), st.integers(0, 50), st.integers(0, 10**15)), min_size=1, max_size=30))
@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_any_counts(counts: list[int | None]) -> None:
    folded([Observation(i, x) for i, x in enumerate(counts)], FEW)


# Positions and what is missing


@pytest.mark.parametrize("size", [1, 40])
def test_all_missing(size: int) -> None:
    advanced = advance(start(DEFAULTS), [Observation(i, None) for i in range(size)], Rule())
    assert advanced.posteriors == (None,) * size
    assert advanced.checkpoint == start(DEFAULTS)


def test_missing_before_the_first_count() -> None:
    tail = plain([9, 12, 11, 8])
    late = [Observation(i, None) for i in range(-5, 0)] + tail
    assert folded(late) == folded(tail)


@pytest.mark.parametrize("place", [3, 60])
def test_a_gap_of_ten_thousand(place: int) -> None:
    counts = np.random.default_rng(2).poisson(70.0, 80).tolist()
    far = [Observation(i if i < place else i + 10_000, x) for i, x in enumerate(counts)]
    posteriors = folded(far)
    # After so long, what was known of the run is next to nothing: it is 66 mean gaps.
    assert posteriors[place].run_lengths.probability[0] > 0.5
    assert posteriors[-1].level.mid == pytest.approx(70.0, rel=0.1)


@given(st.lists(st.integers(1, 10**7), min_size=2, max_size=40))
@settings(max_examples=15, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_any_gaps(gaps: list[int]) -> None:
    folded([Observation(int(s), 40 + i % 7) for i, s in enumerate(np.cumsum(gaps))])


def test_positions_far_from_zero() -> None:
    near = folded(plain([9, 12, 11, 8, 14, 30, 33]))
    far = folded([Observation(10**12 + i, x) for i, x in enumerate([9, 12, 11, 8, 14, 30, 33])])
    assert [p.run_lengths for p in near] == [p.run_lengths for p in far]
    negative = folded([Observation(i - 10**12, x) for i, x in enumerate([9, 12, 11, 8, 14, 30, 33])])
    assert [p.run_lengths for p in near] == [p.run_lengths for p in negative]


# Exposure


@pytest.mark.parametrize(("exposure", "level"), [(1e-6, 2e8), (1e6, 0.5)])
def test_extreme_exposure(exposure: float, level: float) -> None:
    counts = np.random.default_rng(3).poisson(exposure * level, 60).tolist()
    last = folded([Observation(i, x, exposure) for i, x in enumerate(counts)], FEW)[-1]
    assert last.level.mid == pytest.approx(level, rel=0.1)


@given(
    st.lists(
        st.tuples(st.integers(0, 10**6), st.floats(1e-6, 40.0), st.floats(0.0, 5.0)), min_size=1, max_size=25
    )
)
@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_any_exposure(values: list[tuple[int, float, float]]) -> None:
    folded([Observation(i, x, e, c) for i, (x, e, c) in enumerate(values)], FEW)


def test_an_exposure_known_to_five_times_itself_says_little() -> None:
    counts = np.random.default_rng(4).poisson(100.0, 40).tolist()
    known = folded(plain(counts))
    vague = folded([*plain(counts[:30]), *(Observation(30 + i, 10, 1.0, 5.0) for i in range(10))])
    assert vague[-1].level.mid == pytest.approx(known[29].level.mid, rel=0.15)


# Other models


@pytest.mark.parametrize(
    "model",
    [
        Model(dispersions=(math.inf,), wanders=((0.0, 1.0),)),
        Model(dispersions=(0.01,), wanders=((1.0, 1.0),)),
        Model(one_off_share=0.9),
        Model(one_off_tail=0.2),
        Model(one_off_tail=6.0),
    ],
    ids=["Poisson", "wild", "nine in ten one-offs", "tail 0.2", "tail 6"],
)
def test_models_at_their_edges(model: Model) -> None:
    counts = [5, 7, 4, 6, 0, 10_000, 5, 8, 2, 6] + [90, 100, 80] * 12
    folded(plain(counts), model)
