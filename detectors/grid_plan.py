"""Which level grids a stream needs: laid for its first counts, then following its level."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from detectors.jump_prior import IndependentLevels
from detectors.level_grid import LevelGrid, grid_over
from detectors.model import Model
from detectors.observation import Observation
from detectors.spacing import (
    FEWEST_NODES,
    LOWEST_LOG_LEVEL,
    MOST_NODES,
    count_variance,
    on_ladder,
    reach,
    widest_spacing,
)

FloatArray = NDArray[np.float64]

REACH_OF_COUNT = 3.2
REACH_OF_LEVEL = 4.8
NEEDED_REACH = 2.8
REFERENCE_SHARE = 0.75
TOLERATED_RISE = 0.35


def log_level_of(observation: Observation) -> float:
    """The log level that one count suggests; half a count stands for none."""
    if observation.count is None:
        raise ValueError("A missing count suggests no level.")
    return float(np.log((observation.count + 0.5) / observation.exposure))


def reference_level(counts: Sequence[Observation]) -> float:
    """The log level that the spacing is chosen for: an upper quantile, which one hit does not move far."""
    return float(np.quantile([log_level_of(o) for o in counts], REFERENCE_SHARE))


def first_grid(
    model: Model, dispersion: FloatArray, wander: FloatArray, counts: Sequence[Observation]
) -> LevelGrid:
    """Lay the grids for a stream's first counts.

    Parameters
    ----------
    model : Model
        The model.
    dispersion, wander : ndarray, shape (pairs,)
        The pairs.
    counts : sequence of Observation
        The counts that the grids must serve, at least one.

    Returns
    -------
    LevelGrid
        Grids that reach beyond every count and beyond the counts' median.
    """
    if isinstance(model.jump, IndependentLevels):
        return _fixed_grid(model.jump, dispersion.size, model.accuracy.spacing)
    levels = np.array([log_level_of(one) for one in counts])
    far = model.accuracy.reach
    lowest, highest = _span(np.full(dispersion.size, np.median(levels)), dispersion, REACH_OF_LEVEL * far)
    for level, one in zip(levels, counts, strict=True):
        same, is_zero = np.full(dispersion.size, level), np.full(dispersion.size, float(one.count == 0))
        low, high = count_span(same, is_zero, dispersion, REACH_OF_COUNT * far)
        lowest, highest = np.minimum(lowest, low), np.maximum(highest, high)
    spacing = pair_spacing(
        model, dispersion, wander, np.asarray(reference_level(counts)), max(len(counts), model.accuracy.early)
    )
    return bounded_grid(spacing, lowest, highest)


def pair_spacing(
    model: Model,
    dispersion: FloatArray,
    wander: FloatArray,
    log_level: FloatArray,
    longest_run: int | FloatArray,
) -> FloatArray:
    """Spacing of each pair's grid at its stream's level, shape (pairs,)."""
    variance = count_variance(log_level, dispersion)
    return on_ladder(widest_spacing(variance, wander, longest_run)) * model.accuracy.spacing


def count_span(
    log_level: FloatArray, is_zero: FloatArray, dispersion: FloatArray, sds: float
) -> tuple[FloatArray, FloatArray]:
    """Lowest and highest log level that a count makes likely; all of shape (pairs,).

    A count of zero makes every low level likely.
    """
    lowest, highest = _span(log_level, dispersion, sds)
    return np.where(is_zero > 0.0, LOWEST_LOG_LEVEL, lowest), highest


def bounded_grid(spacing: FloatArray, lowest: FloatArray, highest: FloatArray) -> LevelGrid:
    """Grids over a range; where that takes too many nodes the spacing is widened instead."""
    least = (highest - lowest) / (MOST_NODES - 2)
    bounded = np.where(spacing < least, on_ladder(np.sqrt(2.0) * least), spacing)
    return grid_over(bounded, lowest, np.maximum(highest, lowest + FEWEST_NODES * bounded))


def _span(log_level: FloatArray, dispersion: FloatArray, sds: float) -> tuple[FloatArray, FloatArray]:
    far = reach(log_level, dispersion, sds)
    lowest = np.maximum(log_level - far, LOWEST_LOG_LEVEL)
    return lowest, np.maximum(log_level + far, lowest + far / 2.0)


def _fixed_grid(levels: IndependentLevels, pairs: int, factor: float) -> LevelGrid:
    shape = np.ones(pairs)
    return grid_over(shape * levels.spacing * factor, shape * levels.lowest, shape * levels.highest)
