"""The random walk on the grid keeps mass, variance and fourth moment."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from detectors.level_grid import LevelGrid
from detectors.wander_kernel import kernel, walk_matrix


def moment(weights: tuple[float, ...], power: int) -> float:
    return math.fsum((1 if k == 0 else 2) * w * k**power for k, w in enumerate(weights))


@given(st.floats(0.0, 30.0))
@settings(max_examples=200, deadline=None)
def test_mass_and_variance(step: float) -> None:
    weights = kernel(step)
    # The outermost of the five points may be negative, by less than 1 / 288 of the weight that moves.
    assert min(weights) >= -1.0 / 288.0 - 1e-15
    assert moment(weights, 0) == pytest.approx(1.0, abs=1e-12)
    # Above one spacing the tails beyond 5.5 standard deviations are cut.
    assert moment(weights, 2) == pytest.approx(step**2, rel=1e-5 if step > 1.0 else 1e-12, abs=1e-15)


@given(st.floats(0.01, 12.0))
@settings(max_examples=100, deadline=None)
def test_fourth_moment_of_a_gaussian_is_three_variances_squared(step: float) -> None:
    assert moment(kernel(step), 4) == pytest.approx(3.0 * step**4, rel=1e-4 if step > 1.0 else 1e-7)


@given(st.floats(0.0, 1.0), st.floats(1.25, 3.0))
@settings(max_examples=100, deadline=None)
def test_weights_as_smooth_as_the_spacing_keeps_them_stay_positive(step: float, sd: float) -> None:
    """Where the level wanders, a posterior standard deviation spans at least 1.25 spacings."""
    size, middle = 41, 20
    gaussian = np.exp(-0.5 * ((np.arange(size) - middle) / sd) ** 2)
    walk = walk_matrix(LevelGrid(np.array([1.0]), np.array([0]), np.array([size])), np.array([step]))
    # The filter empties what falls below zero far out in the tails.
    assert (walk @ gaussian).min() >= -1e-6


def test_no_step_is_the_identity() -> None:
    assert kernel(0.0) == (1.0,)


def test_matrix_against_a_dense_one() -> None:
    grid = LevelGrid(np.array([0.5, 0.25, 0.1]), np.array([-3, 2, 0]), np.array([9, 14, 6]))
    steps = np.array([0.3, 0.6, 0.0])
    dense = np.zeros((grid.rows, grid.rows))
    start = 0
    for size, spacing, step in zip((9, 14, 6), (0.5, 0.25, 0.1), steps.tolist(), strict=True):
        weights = kernel(round(step / spacing, 12), size)
        for i in range(size):
            for j in range(size):
                if abs(i - j) < len(weights):
                    dense[start + i, start + j] = weights[abs(i - j)]
        start += size
    np.testing.assert_array_equal(walk_matrix(grid, steps).toarray(), dense)


def test_many_steps_are_a_gaussian() -> None:
    # Sixteen steps of 0.7 spacings: the central limit, held against the Gaussian with the same variance.
    size, middle = 81, 40
    grid = LevelGrid(np.array([1.0]), np.array([0]), np.array([size]))
    walk = walk_matrix(grid, np.array([0.7]))
    weights = np.eye(1, size, middle)[0]
    for _ in range(16):
        weights = walk @ weights
    sd = 0.7 * 4.0
    gaussian = np.exp(-0.5 * ((np.arange(size) - middle) / sd) ** 2) / (sd * math.sqrt(2.0 * math.pi))
    np.testing.assert_allclose(weights, gaussian, atol=2e-4)
