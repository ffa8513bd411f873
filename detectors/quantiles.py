"""Quantiles of the level from the probability of each grid node."""

import numpy as np
from numpy.typing import NDArray

from detectors.level_grid import LevelGrid
from detectors.posterior import Quantiles

FloatArray = NDArray[np.float64]

SHARES = np.array([0.05, 0.5, 0.95])
REFERENCE_SHARE = 0.99


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
    """
    return quantiles_and_reference(grid, row_mass)[0]


def quantiles_and_reference(grid: LevelGrid, row_mass: FloatArray) -> tuple[Quantiles, float]:
    """The level's quantiles, and the upper quantile of the log level for which the spacing is chosen."""
    mass = row_mass[grid.ascending]
    running = np.cumsum(mass)
    total = running[-1]
    place = min(int(np.searchsorted(running, REFERENCE_SHARE * total)), running.size - 1)
    middle = running - 0.5 * mass
    low, mid, high = np.exp(np.interp(SHARES * total, middle, grid.ascending_log_level)).tolist()
    return Quantiles(low, mid, high), float(grid.ascending_log_level[place])
