"""How finely the level is divided: against the error of the trapezoid rule itself."""

import math

import numpy as np
import pytest

from detectors.spacing import count_variance, on_ladder, resolvable_dispersion, widest_spacing


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


@pytest.mark.parametrize(
    ("wander", "variance"),
    [
        (0.005, 1e-3),
        (0.005, 0.1),
        (0.005, 1.0),
        (0.05, 1e-3),
        (0.05, 0.1),
        (0.05, 1.0),
        (0.3, 0.1),
        (0.3, 1.0),
    ],
)
def test_a_wandering_level_is_resolved_at_its_steady_state(wander: float, variance: float) -> None:
    # The steady state of the scalar filter by iterating it: P <- (P + w^2) v / (P + w^2 + v).
    steady = variance
    for _ in range(20_000):
        steady = (steady + wander**2) * variance / (steady + wander**2 + variance)
    spacing = float(widest_spacing(np.array([variance]), np.array([wander]), 500)[0])
    assert trapezoid_error(math.sqrt(steady), spacing) <= 1e-6


@pytest.mark.parametrize("variance", [1e-3, 1e-6, 1e-12])
def test_where_a_step_is_far_wider_than_a_count_is_uncertain_the_claim_is_lowered(variance: float) -> None:
    """The grid is no finer than a quarter of the step, and then the count is taken as that much less exact."""
    wander, level = 0.3, 60.0
    spacing = widest_spacing(np.array([variance]), np.array([wander]), 500)
    assert spacing[0] == pytest.approx(wander / 4.0)
    dispersion = resolvable_dispersion(spacing, np.array([level]), np.array([1.0 / variance]))
    blurred = float(count_variance(level, dispersion)[0])
    assert trapezoid_error(math.sqrt(blurred), float(spacing[0])) <= 0.005
    # What the next count is expected to be changes by little: the step has the far larger variance.
    assert blurred <= 0.03 * wander**2


def test_a_grid_that_is_fine_enough_claims_what_it_is_given() -> None:
    variance = count_variance(math.log(50.0), np.array([8.0]))
    spacing = on_ladder(widest_spacing(variance, np.array([0.01]), 100))
    assert resolvable_dispersion(spacing, np.array([math.log(80.0)]), np.array([8.0])).tolist() == [8.0]


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
