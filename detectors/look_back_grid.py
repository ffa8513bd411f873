"""Level grids laid once for a whole record."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from detectors.grid_plan import bounded_grid, first_grid
from detectors.jump_prior import IndependentLevels
from detectors.level_grid import LevelGrid
from detectors.model import Model
from detectors.observation import Observation
from detectors.spacing import count_variance, on_ladder, widest_spacing

FloatArray = NDArray[np.float64]

COUNTS_PER_HIGHER_ONE = 4
"""A run at the level of the j-th largest count is taken to have at most this many times j counts."""


def record_grid(
    model: Model, dispersion: FloatArray, wander: FloatArray, counts: Sequence[Observation]
) -> LevelGrid:
    """Lay the grids of all pairs for a whole record.

    Parameters
    ----------
    model : Model
        The model.
    dispersion, wander : ndarray, shape (pairs,)
        The pairs.
    counts : sequence of Observation
        The record without its missing counts, at least one.

    Returns
    -------
    LevelGrid
        Grids that reach as far as the filter's would for these counts, and are as fine as the longest run at
        each level asks.

    Examples
    --------
    >>> counts = [Observation(week, 40) for week in range(100)]
    >>> grid = record_grid(Model(), np.array([16.0]), np.array([0.0]), counts)
    >>> round(float(grid.spacing[0]), 3), bool(grid.lowest[0] < np.log(40) < grid.highest[0])
    (0.044, True)
    """
    reaching = first_grid(model, dispersion, wander, counts)
    if isinstance(model.jump, IndependentLevels):
        return reaching
    spacing = on_ladder(_needed_spacing(dispersion, wander, counts)) * model.accuracy.spacing
    return bounded_grid(spacing, reaching.lowest, reaching.highest)


def _needed_spacing(dispersion: FloatArray, wander: FloatArray, counts: Sequence[Observation]) -> FloatArray:
    """The narrowest of what runs at the level of each count ask for, shape (pairs,)."""
    largest_first = np.sort([-float(one.count or 0) for one in counts])[:, None]
    variance = count_variance(np.log(0.5 - largest_first), dispersion)
    run = np.minimum(COUNTS_PER_HIGHER_ONE * np.arange(1.0, len(counts) + 1.0), len(counts))[:, None]
    standing = widest_spacing(variance, np.zeros_like(wander), np.broadcast_to(run, variance.shape))
    # A level that wanders is never known better than its steady state, nor better than one that stands still.
    wandering = np.maximum(standing, widest_spacing(variance, wander, 1))
    needed: FloatArray = np.where(wander > 0.0, wandering, standing).min(axis=0)
    return needed
