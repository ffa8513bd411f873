"""Weights carried to another grid: totals kept exactly, shapes closely, holes not smeared."""

import numpy as np
import pytest

from detectors.jump_prior import JumpPrior
from detectors.level_grid import LevelGrid
from detectors.regrid import extended, respaced


def gaussian(level: np.ndarray, mean: float, sd: float) -> np.ndarray:
    return np.exp(-0.5 * ((level - mean) / sd) ** 2)


def moments(level: np.ndarray, weights: np.ndarray) -> tuple[float, float]:
    share = weights / weights.sum()
    mean = float(level @ share)
    return mean, float((level - mean) ** 2 @ share)


@pytest.mark.parametrize("factor", [0.5, 2**-0.5, 1.0, 2**0.5])
@pytest.mark.parametrize("sd_in_spacings", [0.8, 1.5, 6.0])
def test_totals_are_kept_and_shape_follows(factor: float, sd_in_spacings: float) -> None:
    spacing, sd = 0.1, 0.1 * sd_in_spacings
    old = 4.0 + spacing * np.arange(-60, 61)
    new = np.arange(4.0 - 5.5, 4.0 + 5.5, spacing * factor)
    block = np.stack(
        [gaussian(old, 4.0, sd) * 7.0, gaussian(old, 4.03, sd) * 1e-9, np.zeros(old.size)], axis=1
    )
    moved = respaced(block, old, new)
    np.testing.assert_allclose(moved.sum(axis=0), block.sum(axis=0), rtol=1e-12)
    assert (moved >= 0.0).all()
    for run, centre in ((0, 4.0), (1, 4.03)):
        mean, variance = moments(new, moved[:, run])
        assert mean == pytest.approx(centre, abs=0.02 * sd)
        assert variance == pytest.approx(sd**2, rel=0.05)


def test_the_hole_of_the_jump_prior_stays_a_hole() -> None:
    prior, spacing = JumpPrior(), 0.03
    old = spacing * np.arange(-80, 81)
    new = np.arange(-2.3, 2.3, spacing / 2**0.5)
    moved = respaced(prior.density(old)[:, None], old, new)[:, 0]
    wanted = prior.density(new)
    wanted *= moved.sum() / wanted.sum()
    inside = np.abs(new) < prior.smallest - 2 * spacing
    assert inside.sum() > 5
    assert moved[inside].sum() < 1e-6 * moved.sum()
    assert np.abs(moved - wanted).max() < 0.02 * wanted.max()


def test_the_precision_of_the_weights_is_kept() -> None:
    level = 0.1 * np.arange(40)
    block = gaussian(level, 2.0, 0.3)[:, None].astype(np.float32)
    assert respaced(block, level, 0.07 * np.arange(55)).dtype == np.float32


def test_extending_moves_nothing() -> None:
    spacing = np.array([0.1, 0.2])
    old = LevelGrid(spacing, np.array([5, -2]), np.array([4, 3]))
    new = LevelGrid(spacing, np.array([3, -1]), np.array([8, 5]))
    weights = np.arange(1.0, 15.0).reshape(7, 2)
    moved = extended(weights, old, new)
    by_level = {
        (p, n): w for p, n, w in zip(old.pair.tolist(), old.node.tolist(), weights.tolist(), strict=True)
    }
    for pair, node, got in zip(new.pair.tolist(), new.node.tolist(), moved.tolist(), strict=True):
        assert got == by_level.get((pair, node), [0.0, 0.0])


def test_grids_without_a_node_in_common_leave_nothing() -> None:
    old = LevelGrid(np.array([0.1]), np.array([0]), np.array([3]))
    new = LevelGrid(np.array([0.1]), np.array([50]), np.array([3]))
    assert extended(np.ones((3, 1)), old, new).sum() == 0.0
