"""What a shift does to the level: the jump prior applied to all pairs' grids at once."""

from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from scipy import signal

from detectors.jump_prior import IndependentLevels, JumpPrior
from detectors.level_grid import LevelGrid

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
Map = Callable[[NDArray[np.floating]], NDArray[np.floating]]

LARGEST_MATRIX = 256
FINE = 0.002
"""Below this spacing the sum over the nodes is the integral, 1, to nine digits."""
FARTHEST_JUMP = 200.0
"""Jumps of the log level beyond this (a factor of e^200) are left out of the normalising sum."""


@dataclass(frozen=True)
class _Group:
    """Pairs with one spacing: their rows, padded to one length, and the jump matrix of that length."""

    rows: IntArray
    filled: NDArray[np.bool_]
    targets: IntArray
    spacing: float
    longest: int


def jump_step(jump: JumpPrior | IndependentLevels, grid: LevelGrid) -> Map:
    """Build the map from the level weights that shift now to the level weights of the new run.

    Parameters
    ----------
    jump : JumpPrior or IndependentLevels
        The prior.
    grid : LevelGrid
        The grids.

    Returns
    -------
    callable
        Takes and returns an ndarray of shape (rows,), in the precision given. A jump prior is normalised
        over all nodes that an endless grid of the same spacing would have: what lands beyond the grid's
        ends is lost, as it should be, since the grid spans every level at which the newest count is likely.
    """
    if isinstance(jump, IndependentLevels):
        return _independent(jump, grid)
    groups = [_group(grid, float(h)) for h in np.unique(grid.spacing)]
    return lambda shifting: _apply(jump, groups, shifting)


def _independent(jump: IndependentLevels, grid: LevelGrid) -> Map:
    density = jump.density(grid.log_level) * grid.spacing[grid.pair]
    return lambda shifting: grid.spread(np.add.reduceat(shifting, grid.start)) * density


@lru_cache(maxsize=256)
def jump_weights(jump: JumpPrior, spacing: float, size: int) -> FloatArray:
    """Probability of a jump by 0, 1, ..., size - 1 nodes upwards (or downwards: it is symmetric)."""
    if spacing < FINE:
        weights = jump.density(np.arange(size, dtype=np.float64) * spacing) * spacing
    else:
        offsets = np.arange(max(int(FARTHEST_JUMP / spacing) + 2, size), dtype=np.float64)
        density = jump.density(offsets * spacing)
        weights = (density / (2.0 * density.sum() - density[0]))[:size]
    weights.flags.writeable = False
    return weights


@lru_cache(maxsize=128)
def _toeplitz(jump: JumpPrior, spacing: float, size: int, kind: str) -> NDArray[np.floating]:
    weights: NDArray[np.floating] = jump_weights(jump, spacing, size).astype(kind)
    matrix: NDArray[np.floating] = weights[np.abs(np.arange(size)[:, None] - np.arange(size)[None, :])]
    matrix.flags.writeable = False
    return matrix


def _group(grid: LevelGrid, spacing: float) -> _Group:
    members = np.flatnonzero(grid.spacing == spacing)
    sizes = grid.size[members]
    longest = int(sizes.max())
    places = np.arange(longest)[None, :]
    filled = places < sizes[:, None]
    rows = np.where(filled, grid.start[members][:, None] + places, 0)
    return _Group(rows, filled, rows[filled], spacing, longest)


def _apply(jump: JumpPrior, groups: list[_Group], shifting: NDArray[np.floating]) -> NDArray[np.floating]:
    landed = np.zeros_like(shifting)
    for group in groups:
        leaving = np.where(group.filled, shifting[group.rows], shifting.dtype.type(0))
        landed[group.targets] = _jumped(jump, group, leaving)[group.filled]
    return landed


def _jumped(jump: JumpPrior, group: _Group, leaving: NDArray[np.floating]) -> NDArray[np.floating]:
    if group.longest > LARGEST_MATRIX:
        weights = jump_weights(jump, group.spacing, group.longest)
        both_ways = np.concatenate((weights[:0:-1], weights))[None, :]
        moved = signal.fftconvolve(leaving.astype(np.float64), both_ways, axes=1)
        # The transform's rounding can leave a trace below zero.
        kept = moved[:, group.longest - 1 : 2 * group.longest - 1]
        return np.maximum(kept, 0.0).astype(leaving.dtype)
    size = -(-group.longest // 32) * 32
    matrix = _toeplitz(jump, group.spacing, size, leaving.dtype.str)[: group.longest, : group.longest]
    return leaving @ matrix
