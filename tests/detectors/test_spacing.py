"""How finely the level is divided: against the error of the trapezoid rule itself."""

import math

import numpy as np
import pytest

from detectors.spacing import count_variance, on_ladder, widest_spacing


def trapezoid_error(sd: float, spacing: float) -> float:
    """Largest relative error of the integral of a Gaussian over the offsets of the grid."""
    errors = []
    for offset in np.linspace(0.0, 1.0, 9):
        nodes = (np.arange(-4_000, 4_001) + offset) * spacing
        total = np.exp(-0.5 * (nodes / sd) ** 2).sum() * spacing / (sd * math.sqrt(2.0 * math.pi))
        errors.append(abs(float(total) - 1.0))
    return max(errors)


@pytest.mark.parametrize("run", [1, 30, 600])
@pytest.mark.parametrize(("level", "dispersion"), [(3.0, 1.0), (500.0, 20.0), (10_000.0, 1_000.0)])
def test_a_still_level_is_resolved(level: float, dispersion: float, run: int) -> None:
    variance = count_variance(math.log(level), np.array([dispersion]))
    spacing = float(widest_spacing(variance, np.zeros(1), run)[0])
    # 2 exp(-2 pi^2 (sd / h)^2), by Poisson's summation formula: 0.5 % at h = 1.8 sd.
    sd = math.sqrt(float(variance[0]) / run)
    assert trapezoid_error(sd, spacing) <= 0.005


@pytest.mark.parametrize("wander", [0.005, 0.05, 0.3])
@pytest.mark.parametrize("variance", [1e-3, 0.1, 1.0])
def test_a_wandering_level_is_resolved_at_its_steady_state(wander: float, variance: float) -> None:
    # The steady state of the scalar filter by iterating it: P <- (P + w^2) v / (P + w^2 + v).
    steady = variance
    for _ in range(20_000):
        steady = (steady + wander**2) * variance / (steady + wander**2 + variance)
    spacing = float(widest_spacing(np.array([variance]), np.array([wander]), 500)[0])
    assert trapezoid_error(math.sqrt(steady), spacing) <= 1e-6


def test_variance_of_the_log_of_a_count_by_simulation() -> None:
    # First order in 1 / mean: good to a few per cent at a mean of 400.
    rng = np.random.default_rng(5)
    counts = rng.poisson(400.0 * rng.gamma(50.0, 1.0 / 50.0, 200_000))
    wanted = float(count_variance(math.log(400.0), np.array([50.0]))[0])
    assert float(np.log(counts).var()) == pytest.approx(wanted, rel=0.05)


def test_ladder_is_the_largest_power_not_above() -> None:
    values = np.geomspace(1e-4, 4.0, 300)
    steps = on_ladder(values)
    assert (steps <= values * (1.0 + 1e-9)).all()
    assert (steps * math.sqrt(2.0) > values).all()
    powers = 2.0 * np.log2(steps)
    np.testing.assert_allclose(powers, np.round(powers), atol=1e-9)
