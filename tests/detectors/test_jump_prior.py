"""The jump prior and what it does on a grid, against integrals by scipy."""

import math

import numpy as np
import pytest
from scipy import integrate, stats

from detectors.jump_prior import IndependentLevels, JumpPrior
from detectors.jump_step import jump_step, jump_weights
from detectors.level_grid import LevelGrid

PRIORS = [JumpPrior(), JumpPrior(0.0, 1.0), JumpPrior(0.3, 0.1)]


@pytest.mark.parametrize("prior", PRIORS, ids=str)
def test_density_integrates_to_one(prior: JumpPrior) -> None:
    def at(z: float) -> float:
        return float(prior.density(np.array([z]))[0])

    edge = prior.smallest
    near, _ = integrate.quad(at, edge, edge + 5.0 * prior.scale)
    far, _ = integrate.quad(at, edge + 5.0 * prior.scale, math.inf)
    assert 2.0 * (near + far) == pytest.approx(1.0, abs=1e-7)
    z = np.linspace(-0.999 * edge, 0.999 * edge, 11)
    assert (prior.density(z) == 0.0).all()


@pytest.mark.parametrize("spacing", [0.02, 0.1, 0.3])
def test_weights_on_an_endless_grid_sum_to_one(spacing: float) -> None:
    weights = jump_weights(JumpPrior(), spacing, int(200.0 / spacing))
    assert weights[0] + 2.0 * weights[1:].sum() == pytest.approx(1.0, abs=1e-6)


def test_step_against_a_dense_matrix() -> None:
    prior = JumpPrior(0.1, 0.5)
    grid = LevelGrid(np.array([0.1, 0.05, 0.1]), np.array([-8, 3, 0]), np.array([17, 30, 12]))
    leaving = np.random.default_rng(1).random(grid.rows)
    landed = jump_step(prior, grid)(leaving)
    for pair in range(3):
        rows = slice(int(grid.start[pair]), int(grid.start[pair] + grid.size[pair]))
        spacing = float(grid.spacing[pair])
        far = np.arange(-int(200.0 / spacing), int(200.0 / spacing) + 1) * spacing
        level = grid.log_level[rows]
        dense = prior.density(level[:, None] - level[None, :]) / prior.density(far).sum()
        np.testing.assert_allclose(landed[rows], dense @ leaving[rows], rtol=1e-6)


def test_independent_levels_forget_the_level_before() -> None:
    prior = IndependentLevels(shape=2.0, rate=0.5, lowest=-12.0, highest=6.0, spacing=0.05)
    first, size = int(-12.0 / 0.05), int(18.0 / 0.05) + 1
    grid = LevelGrid(np.array([0.05]), np.array([first]), np.array([size]))
    leaving = np.random.default_rng(2).random(grid.rows)
    landed = jump_step(prior, grid)(leaving)
    assert landed.sum() == pytest.approx(leaving.sum(), rel=1e-6)
    gamma = stats.gamma(2.0, scale=2.0)
    for edge in (-1.025, 0.025, 1.075, 2.025):
        # Half a cell above a node, so that the sum of cells ends where the distribution function is taken.
        below = landed[grid.log_level < edge].sum() / landed.sum()
        assert below == pytest.approx(gamma.cdf(math.exp(edge)), abs=2e-4)
