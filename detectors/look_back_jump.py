"""The jump prior applied to many columns of level weights at once."""

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy import signal
from scipy.linalg import toeplitz

from detectors.jump_prior import IndependentLevels, JumpPrior
from detectors.jump_step import jump_weights
from detectors.level_grid import LevelGrid

FloatArray = NDArray[np.float64]
ColumnMap = Callable[[FloatArray], FloatArray]

LARGEST_MATRIX = 512


def column_jump(jump: JumpPrior | IndependentLevels, grid: LevelGrid) -> ColumnMap:
    """Build the map from level weights before a shift to level weights after it.

    Parameters
    ----------
    jump : JumpPrior or IndependentLevels
        The prior.
    grid : LevelGrid
        The grids.

    Returns
    -------
    callable
        Takes and returns an ndarray of shape (rows, columns). It is what `jump_step` does to one column.

    Examples
    --------
    >>> grid = LevelGrid(np.array([0.5]), np.array([0]), np.array([3]))
    >>> column_jump(JumpPrior(), grid)(np.array([[0.0], [1.0], [0.0]])).round(3).tolist()
    [[0.318], [0.0], [0.318]]
    """
    if isinstance(jump, IndependentLevels):
        density = (jump.density(grid.log_level) * grid.spread(grid.spacing))[:, None]
        return lambda weights: np.repeat(np.add.reduceat(weights, grid.start), grid.size, axis=0) * density
    longest = {h: int(grid.size[grid.spacing == h].max()) for h in np.unique(grid.spacing).tolist()}
    blocks = {h: _block(jump, h, size) for h, size in longest.items()}
    pairs = list(zip(grid.spacing.tolist(), grid.start.tolist(), grid.size.tolist(), strict=True))
    return lambda weights: np.concatenate([blocks[h](weights[start : start + n]) for h, start, n in pairs])


def transposed_jump(jump: JumpPrior | IndependentLevels, grid: LevelGrid) -> ColumnMap:
    """Build the map from weights of the level after a shift to their expectation given the level before it.

    A jump prior is symmetric, so that its map is its own transpose.
    """
    if not isinstance(jump, IndependentLevels):
        return column_jump(jump, grid)
    density = (jump.density(grid.log_level) * grid.spread(grid.spacing))[:, None]
    return lambda weights: np.repeat(np.add.reduceat(weights * density, grid.start), grid.size, axis=0)


def _block(jump: JumpPrior, spacing: float, longest: int) -> ColumnMap:
    """The map on one grid of at most so many nodes."""
    weights = jump_weights(jump, spacing, longest)
    if longest <= LARGEST_MATRIX:
        matrix = toeplitz(weights)
        return lambda block: matrix[: len(block), : len(block)] @ block
    return lambda block: _convolved(weights[: len(block)], block)


def _convolved(weights: FloatArray, block: FloatArray) -> FloatArray:
    both_ways = np.concatenate((weights[:0:-1], weights))[:, None]
    moved = signal.fftconvolve(block, both_ways, axes=0)[weights.size - 1 : 2 * weights.size - 1]
    # The transform's rounding can leave a trace below zero.
    kept: FloatArray = np.maximum(moved, 0.0)
    return kept
