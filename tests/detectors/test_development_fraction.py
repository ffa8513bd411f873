"""Expected fractions: evidence, what deviation is seen in fact, and streams that lean on their slate."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from detectors.development import Development, chain_ladder
from detectors.development_check import median_check, robust_chain_ladder
from detectors.development_fraction import Evidence, Fraction, NotEnough, expected_fraction, fraction_for
from detectors.development_pool import pool
from detectors.development_ultimate import ultimates
from detectors.errors import UnusableParameter
from detectors.growth_triangle import Triangle

LEAST = Evidence(rows=2, counts=1)


def grown(shares: list[float], totals: list[float]) -> Triangle:
    """A complete triangle of releases that all grow by the same shares."""
    return Triangle(tuple(float(k + 1) for k in range(len(shares))), np.outer(totals, shares))


cells_or_none = st.one_of(st.none(), st.integers(0, 10**7))


@given(st.lists(st.lists(cells_or_none, min_size=4, max_size=4), max_size=12))
@settings(max_examples=80, deadline=None)
def test_whatever_is_known_the_answer_is_a_value(rows: list[list[int | None]]) -> None:
    counts = np.array([[math.nan if cell is None else float(cell) for cell in row] for row in rows])
    cells = Triangle((1.0, 2.0, 4.0, 7.0), counts.reshape(-1, 4))
    development = robust_chain_ladder(cells)
    ultimates(cells, development)
    median_check(cells, development)
    for age in (0.5, 1.0, 3.1, 6.9):
        told = fraction_for(development, pool([development] * 3), age, evidence=LEAST)
        if isinstance(told, NotEnough):
            assert told.why.endswith(".")
        else:
            assert 0.0 < told.fraction < math.inf
            assert 0.0 <= told.relative_sd < math.inf


def test_not_enough_is_a_value_that_says_what_lacks() -> None:
    few = chain_ladder(grown([0.5, 0.8, 1.0], [100.0] * 7))
    told = expected_fraction(few, 1.0)
    assert isinstance(told, NotEnough)
    assert told.why == "Growth from 1 to 2 days is known of 7 releases; 8 are needed."
    tiny = expected_fraction(chain_ladder(grown([0.5, 1.0], [10.0] * 9)), 1.5)
    assert isinstance(tiny, NotEnough)
    assert tiny.why == "Growth from 1 to 2 days rests on 45 counts; 100 are needed."
    # At the last stated age a count is final, whatever is known of growth.
    assert expected_fraction(few, 3.0) == Fraction(3.0, 1.0, 0.0, 0.0, 0.0)
    with pytest.raises(UnusableParameter):
        expected_fraction(few, -1.0)


def test_only_the_steps_still_ahead_need_evidence() -> None:
    cells = np.array([[np.nan, 80.0, 100.0]] * 8)
    told = expected_fraction(chain_ladder(Triangle((1.0, 3.0, 7.0), cells)), 3.0)
    assert isinstance(told, Fraction)
    assert told.fraction == pytest.approx(0.8)
    assert isinstance(expected_fraction(chain_ladder(Triangle((1.0, 3.0, 7.0), cells)), 2.0), NotEnough)


def whole(development: Development, age: float) -> Fraction:
    told = expected_fraction(development, age)
    assert isinstance(told, Fraction)
    return told


def test_the_deviation_that_enters_the_filter_is_the_one_seen() -> None:
    # Shape of growth varies by 20 % a release and persists from step to step, which Mack's model excludes.
    random = np.random.default_rng(2)
    level, dispersion, squares, macks = 3000.0, 20.0, [], []
    for _ in range(250):
        shape = np.exp(random.normal(0.0, 0.2, (31, 1)) * np.array([1.0, 0.4, 0.0])) * [0.5, 0.8, 1.0]
        rises = np.maximum(np.diff(shape, axis=1, prepend=0.0), 0.0)
        size = level * random.gamma(dispersion, 1 / dispersion, (31, 1))
        counts = np.cumsum(random.poisson(size * rises), axis=1).astype(float)
        told = whole(robust_chain_ladder(Triangle((1.0, 3.0, 7.0), counts[:30])), 1.0)
        mean = told.fraction * level
        for sd, into in ((told.relative_sd, squares), (told.standard_error, macks)):
            variance = mean + mean**2 * (1 / dispersion + sd**2 * (1 + 1 / dispersion))
            into.append((counts[30, 0] - mean) ** 2 / variance)
    # 250 squares of about unit variance: their mean is 1 give or take 0.09. Measured: 1.01.
    assert np.mean(squares) == pytest.approx(1.0, abs=0.27)
    # Steps taken as uncorrelated promise too much: measured 1.28.
    assert np.mean(macks) > np.mean(squares) + 0.15


def test_sparse_counts_are_not_excused_twice() -> None:
    # Pure Poisson growth: nothing beyond the chance that the negative binomial has already.
    random = np.random.default_rng(4)
    counts = np.cumsum(random.poisson(5.0, (400, 2)), axis=1).astype(float)
    told = whole(chain_ladder(Triangle((1.0, 7.0), counts)), 1.0)
    assert told.process_sd == pytest.approx(math.sqrt(0.5 / 5.0), rel=0.15)
    assert told.relative_sd < 0.5 * told.process_sd


def test_pooling_knows_that_streams_differ() -> None:
    def stream(share: float, totals: float, rows: int) -> Development:
        jitter = 1.0 + 0.02 * np.array([(-1.0) ** row for row in range(rows)])
        cells = np.column_stack([share * totals * jitter, np.full(rows, totals)])
        return chain_ladder(Triangle((1.0, 7.0), cells))

    alike = pool([stream(0.5, total, 10) for total in (100.0, 1000.0, 100_000.0)])
    unlike = pool(
        [stream(share, total, 10) for share, total in ((0.4, 100.0), (0.5, 1000.0), (0.6, 100_000.0))]
    )
    same, other = (expected_fraction(shared, 1.0, basis="slate") for shared in (alike, unlike))
    assert isinstance(same, Fraction)
    assert isinstance(other, Fraction)
    assert same.fraction == pytest.approx(0.5, rel=0.01)
    assert same.parameter_sd < 0.01
    # The largest show does not speak for all: 0.6 by sums, about 0.49 as a mean of shows.
    assert other.fraction == pytest.approx(0.49, abs=0.02)
    # Standard deviation of the three log factors: 0.20.
    assert other.parameter_sd == pytest.approx(0.2, rel=0.25)


def test_a_stream_with_too_little_leans_on_its_slate() -> None:
    rich = chain_ladder(grown([0.5, 1.0], [100.0, 120.0, 90.0, 110.0]))
    poor = chain_ladder(grown([0.5, 1.0], [100.0]))
    told = fraction_for(poor, pool([rich, rich, rich]), 1.0)
    assert isinstance(told, Fraction)
    assert told.basis == "slate"
    alone = fraction_for(poor, pool([rich, rich]), 1.0)
    assert isinstance(alone, NotEnough)
    assert "1 releases; 8 are needed" in alone.why
    full = chain_ladder(grown([0.5, 1.0], [100.0] * 8))
    own = fraction_for(full, pool([rich, rich, rich]), 1.0)
    assert isinstance(own, Fraction)
    assert own.basis == "stream"


def test_pooling_needs_the_same_ages() -> None:
    with pytest.raises(UnusableParameter):
        pool([chain_ladder(grown([0.5, 1.0], [1.0])), chain_ladder(grown([0.5, 0.8, 1.0], [1.0]))])
    with pytest.raises(UnusableParameter):
        pool([])
