"""Quantiles of the level from the probability of each grid node."""

import numpy as np
from numpy.typing import NDArray

from detectors.level_grid import LevelGrid
from detectors.posterior import Quantiles

FloatArray = NDArray[np.float64]

SHARES = np.array([0.05, 0.5, 0.95])


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
        In counts per unit of exposure. Between the nodes the distribution function is taken as straight.
    """
    mass = row_mass[grid.ascending]
    running = np.cumsum(mass)
    middle = running - 0.5 * mass
    low, mid, high = np.exp(np.interp(SHARES * running[-1], middle, grid.ascending_log_level)).tolist()
    return Quantiles(low, mid, high)


def upper_log_level(log_level: FloatArray, row_mass: FloatArray, share: float) -> float:
    """The node at which the running probability, by ascending level, first reaches a share."""
    order = np.argsort(log_level, kind="stable")
    running = np.cumsum(row_mass[order])
    place = min(int(np.searchsorted(running, share * running[-1])), running.size - 1)
    return float(log_level[order[place]])
