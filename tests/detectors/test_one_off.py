"""The one-off component and its mixture with the ordinary law, against 60-digit arithmetic."""

import math

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from detectors.counts import log_negative_binomial
from detectors.one_off import log_one_off, mixture, one_off_cdf, one_off_probability


@pytest.mark.parametrize("tail", [1.0, 0.5, 2.5])
@pytest.mark.parametrize("level", [0.1, 1.0, 37.0, 1e3, 1e6])
def test_one_off_sums_to_one(level: float, tail: float) -> None:
    # The first counts one by one; what is left telescopes to 1 - F(x + 1/2), here from its own formula.
    counts = np.arange(300_000)
    left = 1.0 / (1.0 + ((counts[-1] + 0.5) / level) ** tail)
    total = math.fsum(np.exp(log_one_off(counts, level, tail))) + left
    assert total == pytest.approx(1.0, abs=1e-9)


@pytest.mark.parametrize("count", [0, 1, 2, 77, 10**6, 10**12])
@pytest.mark.parametrize("tail", [1.0, 0.5, 1.0000001, 3.0])
@pytest.mark.parametrize("level", [0.1, 40.0, 1e6])
def test_one_off_against_its_definition(count: int, tail: float, level: float) -> None:
    with mpmath.workdps(60):
        half, m, beta = mpmath.mpf(1) / 2, mpmath.mpf(level), mpmath.mpf(tail)
        upper = 1 / (1 + (m / (count + half)) ** beta)
        lower = 1 / (1 + (m / (count - half)) ** beta) if count else mpmath.mpf(0)
        exact = mpmath.log(upper - lower)
        error = abs(mpmath.mpf(float(log_one_off(count, level, tail))) - exact)
        assert error <= 1e-13 * max(1, abs(exact))
        assert float(one_off_probability(count, level, tail)) == pytest.approx(
            float(upper - lower), rel=1e-12
        )
        below, up_to = one_off_cdf(count, level, tail)
        assert float(below) == pytest.approx(float(lower), rel=1e-13)
        assert float(up_to) == pytest.approx(float(upper), rel=1e-13)


def test_one_off_is_heavy_on_both_sides() -> None:
    # A hundredfold hit and a hundredth: impossible for the ordinary law, ordinary for the broad one.
    for count in (100_000, 10):
        assert log_negative_binomial(count, 1_000.0, 20.0) < -50.0
        assert log_one_off(count, 1_000.0, 1.0) > -17.0
    at_hundredfold, at_ten_thousandfold = log_one_off([100_000, 10_000_000], 1_000.0, 1.0)
    assert at_hundredfold - at_ten_thousandfold == pytest.approx(2 * math.log(100), abs=0.02)


@given(
    ordinary=st.floats(-1e6, 0.0),
    broad=st.floats(-1e3, 0.0),
    share=st.floats(1e-6, 0.5),
)
@settings(max_examples=100, deadline=None)
def test_mixture(ordinary: float, broad: float, share: float) -> None:
    log_p, one_off = mixture(np.array([ordinary]), np.array([broad]), share)
    with mpmath.workdps(60):
        first = (1 - mpmath.mpf(share)) * mpmath.exp(ordinary)
        second = mpmath.mpf(share) * mpmath.exp(broad)
        assert log_p[0] == pytest.approx(float(mpmath.log(first + second)), rel=1e-14, abs=1e-15)
        assert one_off[0] == pytest.approx(float(second / (first + second)), rel=1e-12, abs=1e-300)


def test_mixture_without_one_offs_is_the_ordinary_law() -> None:
    ordinary = np.array([-3.0, -1e9])
    log_p, one_off = mixture(ordinary, np.array([-1.0, -1.0]), 0.0)
    assert log_p.tolist() == [-3.0, -1e9]
    assert one_off.tolist() == [0.0, 0.0]


def test_one_off_cdf_steps_are_the_probabilities() -> None:
    counts = np.arange(5_000)
    for tail in (0.7, 1.0, 2.0):
        below, up_to = one_off_cdf(counts, 90.0, tail)
        np.testing.assert_allclose(up_to - below, np.exp(log_one_off(counts, 90.0, tail)), atol=1e-15)
        np.testing.assert_array_equal(below[1:], up_to[:-1])


@pytest.mark.parametrize("count", [0, 1, 2, 10, 2**31, 2**53 - 1, 2**53])
def test_finite_to_the_last_whole_number(count: int) -> None:
    means = np.array([1e-300, 1e-3, 1.0, 1e6, 1e10, 2.0**53, 1e300])
    for tail in (1.0, 0.6, 3.0):
        assert np.isfinite(log_one_off(count, means[1:-1], tail)).all()
        below, up_to = one_off_cdf(count, means, tail)
        assert (below >= 0.0).all()
        assert (below <= up_to).all()
        assert (up_to <= 1.0).all()


@given(count=st.integers(0, 10**9), level=st.floats(1e-3, 1e9))
@settings(max_examples=100, deadline=None)
def test_closed_form_at_tail_one_is_the_general_form(count: int, level: float) -> None:
    general = np.nextafter(1.0, 2.0)
    assert log_one_off(count, level, 1.0) == pytest.approx(
        log_one_off(count, level, general), rel=1e-12, abs=1e-12
    )
    assert one_off_cdf(count, level, 1.0) == pytest.approx(one_off_cdf(count, level, general), rel=1e-12)
