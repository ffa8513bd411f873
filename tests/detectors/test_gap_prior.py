"""The gap prior against values computed from its definition with 60 digits."""

import json
import math
from pathlib import Path

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from detectors.errors import UnusableParameter
from detectors.gap_prior import GapPrior

VECTORS = json.loads((Path(__file__).parents[1] / "vectors" / "gap_hazard.json").read_text(encoding="utf-8"))
PRIORS = [GapPrior(k, mean) for k in (1, 2, 3, 5) for mean in (20.0, 50.0, 200.0)]
TOLERANCE = 1e-12
# The first-run column and the survival columns are cut after 18 digits or more, the means after 6 (3.1).


def relative(got: float, wanted: str | mpmath.mpf) -> float:
    with mpmath.workdps(40):
        exact = mpmath.mpf(wanted)
        return float(abs(mpmath.mpf(float(got)) - exact) / (abs(exact) or 1))


def survival(shape: int, p: mpmath.mpf, t: int) -> mpmath.mpf:
    """P(fewer than `shape` successes in t trials), from the definition."""
    return mpmath.fsum(mpmath.binomial(t, i) * p**i * (1 - p) ** (t - i) for i in range(shape))


def first_survival(shape: int, p: mpmath.mpf, t: int) -> mpmath.mpf:
    """sum_{g >= t} S(g) / sum_{g >= 0} S(g), with the sum over g done by the i-th success's mean 1 / p."""
    return mpmath.fsum(survival(i, p, t) for i in range(1, shape + 1)) / shape


# Source: the vectors file; definitions of Fearnhead (2006), the mean residual from renewal theory.


@pytest.mark.parametrize("prior", PRIORS, ids=str)
def test_hazards_to_run_length_100000(prior: GapPrior) -> None:
    rows = [row for row in VECTORS["hazard"] if row[:2] == [prior.shape, prior.mean]]
    assert rows[-1][2] == 100_000
    lengths = [row[2] for row in rows]
    for got, row in zip(prior.hazard(lengths), rows, strict=True):
        assert relative(got, row[3]) <= TOLERANCE
    for got, row in zip(prior.first_hazard(lengths), rows, strict=True):
        assert relative(got, row[4]) <= TOLERANCE


@pytest.mark.parametrize("row", VECTORS["elapsed"], ids=str)
def test_elapsed_time(row: list[object]) -> None:
    shape, mean, age, gap, wanted = row
    assert relative(GapPrior(shape, mean).shift_within([age], gap)[0], wanted) <= TOLERANCE


@pytest.mark.parametrize("row", VECTORS["log_survival"], ids=str)
def test_log_survival(row: list[object]) -> None:
    shape, mean, t, wanted = row
    assert relative(GapPrior(shape, mean).log_survival([t])[0], wanted) <= TOLERANCE


@pytest.mark.parametrize("row", VECTORS["first_mean_residual"], ids=str)
def test_mean_of_the_first_run(row: list[object]) -> None:
    shape, mean, wanted = row
    digits = len(wanted.partition(".")[2])
    assert GapPrior(shape, mean).first_mean_residual([0])[0] == pytest.approx(
        float(wanted), abs=0.5 * 10.0**-digits + 1e-10
    )


def test_every_vector_is_used() -> None:
    assert len(VECTORS["hazard"]) == 132
    assert {(row[0], row[1]) for row in VECTORS["hazard"]} == {(p.shape, p.mean) for p in PRIORS}


# Against sums of the definition where no table reaches: other shapes, means, ages and gaps.

CASES = [
    (1, 1.5, 3, 2),
    (2, 1234.5, 0, 10_000),
    (2, 1e6, 17, 1),
    (3, 777.7, 5_000, 10_000),
    (5, 75018.42543049145, 5076, 94542),
    (5, 6.0, 40, 3),
    (8, 5_000.0, 100, 12),
    (20, 63983.0, 167, 41834),
    (60, 569008.7, 100, 55736),
    (60, 90.0, 10, 50),
]


@pytest.mark.parametrize(("shape", "mean", "age", "gap"), CASES)
def test_against_sums(shape: int, mean: float, age: int, gap: int) -> None:
    prior = GapPrior(shape, mean)
    with mpmath.workdps(300):
        p = mpmath.mpf(shape) / mpmath.mpf(mean)
        ordinary = 1 - survival(shape, p, age + gap) / survival(shape, p, age)
        first = 1 - first_survival(shape, p, age + gap) / first_survival(shape, p, age)
        log_survival = mpmath.log(survival(shape, p, age + gap))
    assert relative(prior.shift_within([age], gap)[0], ordinary) <= TOLERANCE
    assert relative(prior.first_shift_within([age], gap)[0], first) <= TOLERANCE
    assert relative(prior.log_survival([age + gap])[0], log_survival) <= TOLERANCE


@given(
    shape=st.integers(1, 12),
    stretch=st.floats(1.001, 1e4),
    age=st.integers(0, 3_000),
    gap=st.integers(1, 3_000),
)
@settings(max_examples=60, deadline=None)
def test_against_sums_anywhere(shape: int, stretch: float, age: int, gap: int) -> None:
    prior = GapPrior(shape, shape * stretch)
    with mpmath.workdps(200):
        p = mpmath.mpf(shape) / mpmath.mpf(prior.mean)
        ordinary = 1 - survival(shape, p, age + gap) / survival(shape, p, age)
    got = prior.shift_within([age], gap)[0]
    if age + gap < shape:
        # Fewer trials than successes needed: exactly 0, where the difference of 200 digits is its rounding.
        assert got == 0.0
    else:
        assert relative(got, ordinary) <= TOLERANCE


def test_hazard_of_shape_two_has_a_closed_form() -> None:
    # From the definition: h(t) = (t-1) p^2 / (q + (t-1) p), h0(t) = p (q + (t-1) p) / (2 q + (t-1) p).
    prior = GapPrior(2, 37.0)
    t = np.arange(1, 5_000)
    p, q = 2.0 / 37.0, 35.0 / 37.0
    np.testing.assert_allclose(prior.hazard(t), (t - 1) * p**2 / (q + (t - 1) * p), rtol=1e-14)
    np.testing.assert_allclose(
        prior.first_hazard(t), p * (q + (t - 1) * p) / (2 * q + (t - 1) * p), rtol=1e-14
    )


def test_shape_one_has_a_constant_hazard() -> None:
    prior = GapPrior(1, 80.0)
    ages = np.array([0, 1, 100, 99_999, 10_000_000])
    np.testing.assert_allclose(prior.shift_within(ages, 9), -math.expm1(9 * math.log1p(-1 / 80)), rtol=1e-15)
    np.testing.assert_array_equal(prior.shift_within(ages, 9), prior.first_shift_within(ages, 9))


@pytest.mark.parametrize("prior", PRIORS, ids=str)
def test_hazards_give_distributions(prior: GapPrior) -> None:
    t = np.arange(1, int(40 * prior.mean))
    for hazard, mean in (
        (prior.hazard(t), prior.mean),
        (prior.first_hazard(t), prior.first_mean_residual([0])[0]),
    ):
        surviving = np.concatenate(([1.0], np.cumprod(1.0 - hazard)))
        pmf = surviving[:-1] * hazard
        assert pmf.sum() == pytest.approx(1.0, abs=1e-12)
        assert (pmf * t).sum() == pytest.approx(mean, rel=1e-10)


@pytest.mark.parametrize("prior", PRIORS, ids=str)
def test_first_run_is_what_is_left_of_an_ordinary_one(prior: GapPrior) -> None:
    # g0(t) = S(t-1) / E[T], the equilibrium distribution of renewal theory.
    t = np.arange(1, 500)
    hazard = prior.first_hazard(t)
    pmf = np.concatenate(([1.0], np.cumprod(1.0 - hazard)[:-1])) * hazard
    np.testing.assert_allclose(pmf, np.exp(prior.log_survival(t - 1)) / prior.mean, rtol=1e-12)


def test_mean_residual_from_the_survival_sum() -> None:
    prior = GapPrior(3, 30.0)
    later = np.exp(prior.log_survival(np.arange(25, 3_000)))
    assert prior.mean_residual([25])[0] == pytest.approx(later.sum() / later[0], rel=1e-12)


def test_one_long_gap_equals_many_short_ones() -> None:
    prior = GapPrior(3, 4_000.0)
    stays = np.prod(1.0 - prior.hazard(np.arange(11, 10_011)))
    assert prior.shift_within([10], 10_000)[0] == pytest.approx(1.0 - stays, rel=1e-12)


def test_tables_and_direct_evaluation_agree() -> None:
    prior = GapPrior(5, 300.0)
    small = prior.shift_within([0, 7, 1000], 4)
    beyond_the_tables = prior.shift_within([0, 7, 1000, 50_000_000], 4)
    np.testing.assert_allclose(small, beyond_the_tables[:3], rtol=1e-15)
    # h(t) = p (1 - (k - 1) / (t p) + ...), and 4 / (5e7 / 60) is 4.8e-6.
    assert beyond_the_tables[3] == pytest.approx(1 - (1 - prior.p) ** 4, rel=5e-6)


def test_runs_of_exactly_the_mean() -> None:
    prior = GapPrior(3, 3.0)
    assert prior.hazard([1, 2, 3]).tolist() == [0.0, 0.0, 1.0]
    assert prior.shift_within([0], 2).tolist() == [0.0]
    assert prior.log_survival([2, 3]).tolist() == [0.0, -math.inf]
    np.testing.assert_allclose(prior.first_hazard([1, 2, 3]), [1 / 3, 1 / 2, 1.0], rtol=1e-15)


def test_shapes_follow_the_ages() -> None:
    prior = GapPrior(2, 50.0)
    assert prior.shift_within(np.zeros((2, 3), dtype=np.int64), 1).shape == (2, 3)
    assert prior.shift_within(np.zeros(0, dtype=np.int64), 1).shape == (0,)
    assert float(prior.hazard(2)) == pytest.approx(0.0016, rel=1e-15)


@pytest.mark.parametrize("shape", [0, -1, True, 1.5, 2.0])
def test_unusable_shape(shape: object) -> None:
    with pytest.raises(UnusableParameter, match="shape must be a whole number of at least 1; got"):
        GapPrior(shape, 50.0)


@pytest.mark.parametrize("mean", [1.9, 0.0, -3.0, math.inf, math.nan])
def test_unusable_mean(mean: float) -> None:
    with pytest.raises(UnusableParameter, match="mean must be a finite number of at least the shape, 2; got"):
        GapPrior(2, mean)


def test_unusable_age_and_gap() -> None:
    with pytest.raises(UnusableParameter, match="age must be at least 0; got -1"):
        GapPrior(2, 50.0).shift_within([3, -1], 1)
    with pytest.raises(UnusableParameter, match="gap must be a whole number of at least 1; got 0"):
        GapPrior(2, 50.0).shift_within([3], 0)


@given(
    shape=st.integers(1, 8), stretch=st.floats(1.0, 1e3), age=st.integers(0, 10**8), gap=st.integers(1, 10**8)
)
@settings(max_examples=150, deadline=None)
def test_a_chance_is_never_above_one(shape: int, stretch: float, age: int, gap: int) -> None:
    prior = GapPrior(shape, shape * stretch)
    for chance in (prior.shift_within([age], gap)[0], prior.first_shift_within([age], gap)[0]):
        assert 0.0 <= chance <= 1.0
