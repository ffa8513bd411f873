"""Count likelihoods against published fits, closed forms, 50-digit arithmetic and scipy."""

import json
import math
from pathlib import Path

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import optimize, stats

from detectors.counts import (
    NegativeBinomialRows,
    effective_dispersion,
    log_negative_binomial,
    negative_binomial_cdf,
)

VECTORS = Path(__file__).parents[1] / "vectors"
SCORES = json.loads((VECTORS / "negative_binomial_scores.json").read_text(encoding="utf-8"))
PROMISED = 1e-13


def exact_log(count: int, mean: float, dispersion: float) -> mpmath.mpf:
    """log p from log gamma functions; call it with 50 digits."""
    x, m, r = mpmath.mpf(count), mpmath.mpf(mean), mpmath.mpf(dispersion)
    if math.isinf(dispersion):
        return x * mpmath.log(m) - m - mpmath.loggamma(x + 1)
    ways = mpmath.loggamma(r + x) - mpmath.loggamma(r) - mpmath.loggamma(x + 1)
    return ways + r * mpmath.log(r / (r + m)) + x * mpmath.log(m / (r + m))


def scaled_error(got: float, count: int, mean: float, dispersion: float) -> float:
    with mpmath.workdps(50):
        exact = exact_log(count, mean, dispersion)
        return float(abs(mpmath.mpf(float(got)) - exact) / max(1, abs(exact)))


def random_cases(size: int, seed: int) -> list[tuple[int, float, float]]:
    """Counts to 1e9, a third anywhere and two thirds within reach of the mean; dispersion 0.1 to 1e6."""
    rng = np.random.default_rng(seed)
    cases = []
    for _ in range(size):
        r = math.inf if rng.random() < 0.25 else float(10.0 ** rng.uniform(-1, 6))
        m = float(10.0 ** rng.uniform(-3, 10))
        spread = math.sqrt(m + m * m / r) * rng.choice([0.1, 1.0, 8.0])
        near = rng.random() < 2 / 3
        x = m + spread * rng.normal() if near else 10.0 ** rng.uniform(-1, 9)
        cases.append((int(min(max(x, 0.0), 1e9)), m, r))
    return cases


def test_error_over_the_promised_range() -> None:
    cases = random_cases(1500, seed=5)
    assert sum(x == 0 for x, _, _ in cases) > 50
    got = log_negative_binomial(*(np.array(column) for column in zip(*cases, strict=True)))
    worst = max(scaled_error(g, *case) for g, case in zip(got, cases, strict=True))
    assert worst <= PROMISED


@pytest.mark.parametrize("offset", [-300_000, -40_000, -1_000, -1, 0, 1, 1_000, 40_000, 300_000])
@pytest.mark.parametrize("dispersion", [1e6, 123_456.7, math.inf])
def test_error_where_log_gamma_differences_lose_seven_digits(offset: int, dispersion: float) -> None:
    count = 10**9 + offset
    assert scaled_error(log_negative_binomial(count, 1e9, dispersion)[()], count, 1e9, dispersion) <= PROMISED


@pytest.mark.parametrize("edge", [0.0239, 0.0240, 0.0241, 0.0243, 0.0244, -0.0236, -0.0237, -0.0238])
@pytest.mark.parametrize("mean", [5e3, 5e6, 5e8])
def test_error_where_series_and_logarithm_meet(edge: float, mean: float) -> None:
    count = round(mean * (1 + edge))
    for dispersion in (50.0, 1e6, math.inf):
        got = log_negative_binomial(count, mean, dispersion)[()]
        assert scaled_error(got, count, mean, dispersion) <= PROMISED


@pytest.mark.parametrize("count", [0, 1, 2, 10, 2**31, 2**53 - 1, 2**53])
def test_finite_and_right_in_kind_to_the_last_whole_number(count: int) -> None:
    means = np.array([1e-3, 1.0, 1e6, 1e10, 2.0**53])[:, None]
    dispersions = np.array([1e-3, 0.1, 6.0, 1e6, 1e12, math.inf])
    log_p = log_negative_binomial(count, means, dispersions)
    assert log_p.shape == (5, 6)
    assert np.isfinite(log_p).all()
    assert (log_p <= 0.0).all()
    for row, mean in zip(log_p, means[:, 0], strict=True):
        for got, dispersion in zip(row, dispersions, strict=True):
            assert scaled_error(got, count, float(mean), float(dispersion)) <= 1e-9


@pytest.mark.parametrize("dispersion", [0.5, 7.0, 1e5, math.inf])
def test_rises_to_the_count_and_falls_beyond(dispersion: float) -> None:
    # For given count and dispersion the likelihood of the mean has its maximum at the count.
    means = np.geomspace(1.0, 1e8, 4001)
    log_p = log_negative_binomial(10_000, means, dispersion)
    steps = np.diff(log_p)
    assert (steps[means[1:] <= 10_000] > 0.0).all()
    assert (steps[means[:-1] >= 10_000] < 0.0).all()


@given(
    count=st.integers(0, 3_000),
    mean=st.floats(0.05, 3_000.0),
    dispersion=st.floats(0.2, 500.0),
)
@settings(max_examples=150, deadline=None)
def test_agrees_with_scipy(count: int, mean: float, dispersion: float) -> None:
    theirs = stats.nbinom.logpmf(count, dispersion, dispersion / (dispersion + mean))
    assert log_negative_binomial(count, mean, dispersion) == pytest.approx(theirs, rel=1e-9, abs=1e-9)
    poisson = stats.poisson.logpmf(count, mean)
    assert log_negative_binomial(count, mean, math.inf) == pytest.approx(poisson, rel=1e-9, abs=1e-9)


def test_sums_to_one() -> None:
    counts = np.arange(40_000)
    for mean, dispersion in ((0.3, 0.4), (25.0, 1.7), (900.0, 40.0), (900.0, math.inf)):
        total = np.exp(log_negative_binomial(counts, mean, dispersion)).sum()
        assert total == pytest.approx(1.0, abs=1e-12)


def test_poisson_with_gamma_mixing() -> None:
    # Gamma(3, rate 2) mixing gives NB(size 3, p = 2/3): 8/27, 8/27, 16/81, 80/729 (Johnson, Kemp & Kotz,
    # Univariate Discrete Distributions; exact fractions by hand).
    got = np.exp(log_negative_binomial([0, 1, 2, 3], 1.5, 3.0))
    np.testing.assert_allclose(got, [8 / 27, 8 / 27, 16 / 81, 80 / 729], rtol=1e-14)


@pytest.mark.parametrize("row", SCORES["rows"], ids=str)
def test_scores_of_one_forecast(row: list[object]) -> None:
    # Source: the vectors file, after Czado, Gneiting & Held (2009), Biometrics 65, 1254-1261.
    count, pmf, below, up_to, log_score = row[0], *map(float, row[1:])
    log_p = log_negative_binomial(count, SCORES["mean"], SCORES["size"])
    assert np.exp(log_p) == pytest.approx(pmf, rel=1e-13)
    assert -log_p == pytest.approx(log_score, rel=1e-11)
    got_below, got_up_to = negative_binomial_cdf(count, SCORES["mean"], SCORES["size"])
    assert got_below == pytest.approx(below, rel=1e-13)
    assert got_up_to == pytest.approx(up_to, rel=1e-13)


# Dispersion by maximum likelihood. The data are the published tables; the estimates were computed from them
# with 40-digit arithmetic and agree with the published ones to the digits printed (those quoted from memory).

FITS = {
    # Bliss & Fisher (1953), Biometrics 9, 176-200: red mites on 150 apple leaves. They give k-hat 1.02459
    # (from memory).
    "mites": ([70, 38, 17, 10, 9, 3, 2, 1, 0], 1.0245923867921253, -222.437153598434808, -242.809940821005),
    # Greenwood & Yule (1920): accidents of 647 munition workers, k-hat 0.865 (data and estimate from memory).
    "accidents": ([447, 132, 42, 21, 3, 2], 0.86511581994518236, -592.267097230427878, -617.184320369274),
    # Bortkiewicz (1898): deaths by horse kick, 280 corps-years, data as in the R package vcd.
    "horse kicks": ([144, 91, 32, 11, 2], 7.6072286543528183, -313.650717331690, -314.154460612114),
}


def log_likelihood(frequencies: list[int], dispersion: float) -> float:
    counts = np.arange(len(frequencies))
    mean = float(np.dot(counts, frequencies) / np.sum(frequencies))
    return float(np.dot(frequencies, log_negative_binomial(counts, mean, dispersion)))


@pytest.mark.parametrize("name", FITS)
def test_dispersion_by_maximum_likelihood(name: str) -> None:
    frequencies, wanted, at_best, at_poisson = FITS[name]
    found = optimize.minimize_scalar(
        lambda log_r: -log_likelihood(frequencies, math.exp(log_r)),
        bounds=(-3.0, 8.0),
        method="bounded",
        options={"xatol": 1e-10},
    )
    # A maximum located by values alone is good to the square root of their precision.
    assert math.exp(found.x) == pytest.approx(wanted, rel=2e-6)
    assert log_likelihood(frequencies, wanted) == pytest.approx(at_best, rel=1e-13)
    assert log_likelihood(frequencies, math.inf) == pytest.approx(at_poisson, rel=1e-13)


@pytest.mark.parametrize("name", FITS)
def test_slope_of_the_likelihood_vanishes_at_the_published_dispersion(name: str) -> None:
    frequencies, wanted, _, _ = FITS[name]
    step = 1e-4

    def slope(log_r: float) -> float:
        above, below = (log_likelihood(frequencies, math.exp(log_r + s)) for s in (step, -step))
        return (above - below) / (2 * step)

    found = optimize.brentq(slope, math.log(wanted) - 0.1, math.log(wanted) + 0.1, xtol=1e-14)
    assert math.exp(found) == pytest.approx(wanted, rel=1e-6)


def test_underdispersed_counts_have_no_best_dispersion() -> None:
    # Bortkiewicz (1898), 200 corps-years, data as in the R package vcd: variance 0.6079 below the mean 0.61.
    frequencies = [109, 65, 22, 3, 1]
    path = [log_likelihood(frequencies, r) for r in np.geomspace(0.1, 1e7, 200)]
    assert (np.diff(path) > 0.0).all()
    assert log_likelihood(frequencies, math.inf) > path[-1]


def test_poisson_is_the_limit() -> None:
    counts = np.array([0, 1, 5, 40, 2_000])
    limit = log_negative_binomial(counts, 30.0, math.inf)
    nearly = log_negative_binomial(counts, 30.0, 1e14)
    np.testing.assert_allclose(nearly, limit, rtol=1e-9)


# Prepared rows


@pytest.mark.parametrize("count", [0, 1, 9, 1_000, 123_456_789])
@pytest.mark.parametrize("exposure", [1.0, 0.3])
def test_prepared_rows_give_the_same(count: int, exposure: float) -> None:
    rng = np.random.default_rng(3)
    mean = 10.0 ** rng.uniform(-2, 9, 300)
    laws, law = np.array([0.3, 4.0, 1e6, math.inf]), rng.integers(0, 4, 300)
    rows = NegativeBinomialRows(mean, laws, law)
    plain = log_negative_binomial(count, mean * exposure, laws[law])
    np.testing.assert_array_equal(rows.log_probability(count, exposure=exposure), plain)


def test_prepared_rows_take_a_count_a_law_and_an_exposure_a_row() -> None:
    rng = np.random.default_rng(4)
    mean, exposure = 10.0 ** rng.uniform(0, 5, 200), rng.uniform(0.2, 3.0, 200)
    laws, law = np.array([2.0, 2.0, math.inf]), rng.integers(0, 3, 200)
    counts = np.array([0.0, 55.0, 1_200.0])
    got = NegativeBinomialRows(mean, laws, law).log_probability(counts, exposure)
    np.testing.assert_array_equal(got, log_negative_binomial(counts[law], mean * exposure, laws[law]))


# Uncertain exposure


def test_effective_dispersion_by_moments_of_a_simulation() -> None:
    rng = np.random.default_rng(11)
    mean, dispersion, relative_sd, size = 200.0, 8.0, 0.3, 400_000
    exposure = rng.gamma(1 / relative_sd**2, relative_sd**2, size)
    level = rng.gamma(dispersion, 1 / dispersion, size)
    counts = rng.poisson(mean * exposure * level)
    effective = effective_dispersion(dispersion, relative_sd)
    wanted = mean + mean**2 / effective
    fourth = np.mean((counts - counts.mean()) ** 4)
    standard_error = math.sqrt((fourth - counts.var() ** 2) / size)
    assert counts.var() == pytest.approx(wanted, abs=4 * standard_error)
    assert 4 * standard_error < 0.03 * wanted


def test_effective_dispersion_at_its_edges() -> None:
    got = effective_dispersion([4.0, math.inf], 0.0)
    assert got.tolist() == [4.0, math.inf]
    assert effective_dispersion(math.inf, 0.1) == pytest.approx(100.0)
    assert effective_dispersion(4.0, 0.1) == pytest.approx(1 / (0.25 + 0.01 + 0.0025))


# Distribution functions


@given(
    count=st.integers(0, 10**9),
    nearness=st.floats(-6.0, 6.0),
    dispersion=st.one_of(st.floats(0.1, 1e6), st.just(math.inf)),
)
@settings(max_examples=150, deadline=None)
def test_cdf_is_a_pair_in_order(count: int, nearness: float, dispersion: float) -> None:
    mean = max(count * math.exp(nearness / math.sqrt(min(dispersion, 1e4))), 1e-3)
    below, up_to = negative_binomial_cdf(count, mean, dispersion)
    assert 0.0 <= below <= up_to <= 1.0
    # The step is the probability, to what two numbers near 1 can tell of it.
    assert up_to - below == pytest.approx(
        float(np.exp(log_negative_binomial(count, mean, dispersion))), rel=1e-6, abs=1e-11
    )


def test_cdf_agrees_with_scipy() -> None:
    counts = np.arange(200)
    for mean, dispersion in ((3.0, 0.4), (60.0, 12.0), (60.0, 900.0)):
        below, up_to = negative_binomial_cdf(counts, mean, dispersion)
        theirs = stats.nbinom.cdf(counts, dispersion, dispersion / (dispersion + mean))
        np.testing.assert_allclose(up_to, theirs, rtol=1e-11)
        np.testing.assert_allclose(below[1:], theirs[:-1], rtol=1e-11)
        assert below[0] == 0.0
    np.testing.assert_allclose(
        negative_binomial_cdf(counts, 60.0, math.inf)[1], stats.poisson.cdf(counts, 60.0), rtol=1e-12
    )
