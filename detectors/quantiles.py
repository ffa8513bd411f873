"""Quantiles of the level from the probability of each grid node."""

import numpy as np
from numpy.typing import NDArray

from detectors.level_grid import LevelGrid
from detectors.posterior import Quantiles

FloatArray = NDArray[np.float64]

SHARES = np.array([0.05, 0.5, 0.95])
NEGLIGIBLE = 1e-6
NOTHING = np.zeros(1)


def level_quantiles(grid: LevelGrid, row_mass: FloatArray) -> Quantiles:
    """The 5 %, 50 % and 95 % quantiles of the level from the probability of each node.

    Parameters
    ----------
    grid : LevelGrid
        The grids.
    row_mass : ndarray, shape (rows,)
        Weight of each node; it need not sum to 1.

    Returns
    -------
    Quantiles
        In counts per unit of exposure.

    Notes
    -----
    Each node's weight is spread evenly over its cell. That alone would widen a pair's distribution by the
    variance of a cell, so its nodes are first drawn towards its mean until the variance is what it was.
    """
    heavy = row_mass > NEGLIGIBLE * row_mass.max()
    centre, width = _cells(grid, row_mass)
    mass, centre, width = row_mass[heavy], centre[heavy], width[heavy]
    edges = np.concatenate((centre - width / 2.0, centre + width / 2.0))
    density = mass / width
    order = edges.argsort(kind="stable")
    edges = edges[order]
    # The distribution function is straight between edges: its slope rises at lower, falls at upper edges.
    slope = np.concatenate((density, -density))[order].cumsum()
    reached = np.concatenate((NOTHING, (slope[:-1] * (edges[1:] - edges[:-1])).cumsum()))
    return Quantiles(*np.exp(np.interp(SHARES * reached[-1], reached, edges)).tolist())


def _cells(grid: LevelGrid, row_mass: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Centre and width of each node's cell."""
    total = np.maximum(np.add.reduceat(row_mass, grid.start), 1e-300)
    mean = np.add.reduceat(row_mass * grid.log_level, grid.start) / total
    distance = grid.log_level - grid.spread(mean)
    variance = np.add.reduceat(row_mass * distance**2, grid.start) / total
    cell = grid.spacing**2 / 12.0
    drawn = np.sqrt(1.0 - cell / np.maximum(variance, cell))
    return grid.spread(mean) + distance * grid.spread(drawn), grid.spread(grid.spacing)


def upper_log_level(log_level: FloatArray, row_mass: FloatArray, share: float) -> float:
    """The node at which the running probability, by ascending level, first reaches a share."""
    order = np.argsort(log_level, kind="stable")
    running = np.cumsum(row_mass[order])
    place = min(int(np.searchsorted(running, share * running[-1])), running.size - 1)
    return float(log_level[order[place]])
