"""How finely, and how far, the log level must be divided for one count series."""

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

LOWEST_LEVEL = 0.01
"""Levels below this many counts per unit of exposure are not told apart."""
LOWEST_LOG_LEVEL = float(np.log(LOWEST_LEVEL))
LOG_LEVEL_RANGE = 46.0
"""Length of the range over which the first level is flat on the log scale."""

STILL_PER_SD = 1.8
WANDERING_PER_SD = 0.72
PER_WANDER = 0.25
"""Where one step of the walk is far wider than a count is uncertain, finer grids than this add nothing: the
level follows each count, and what is expected next hangs on the step (see `resolvable_dispersion`)."""
MOST_NODES = 512
FEWEST_NODES = 8
WIDEST_REACH = 8.0


def count_variance(log_level: float | FloatArray, dispersion: FloatArray) -> FloatArray:
    """Variance of the log of one count: 1 / level + 1 / dispersion, the level at least the lowest."""
    level = np.maximum(np.asarray(log_level, dtype=np.float64), LOWEST_LOG_LEVEL)
    return np.exp(-level) + 1.0 / dispersion


def widest_spacing(variance: FloatArray, wander: FloatArray, longest_run: int | FloatArray) -> FloatArray:
    """Widest spacing of the log level that keeps the trapezoid rule's error negligible.

    Parameters
    ----------
    variance : ndarray, shape (pairs,)
        Variance of the log of one count.
    wander : ndarray, shape (pairs,)
        Standard deviation of the level's random walk per unit of position.
    longest_run : int, or ndarray of shape (pairs,)
        Longest run, in counts, that still carries weight.

    Returns
    -------
    ndarray, shape (pairs,)
        Spacing, a power of the square root of 2, so that pairs share their grids.

    Notes
    -----
    The error falls like exp(-2 pi^2 (sd / h)^2); sd is the posterior standard deviation: sqrt(v / n) for a
    level that stands still, and the steady state of the random walk seen through noise otherwise.
    """
    still = np.sqrt(variance / np.maximum(longest_run, 1)) * STILL_PER_SD
    w2 = wander * wander
    # (sqrt(w^4 + 4 w^2 v) - w^2) / 2, written without the difference.
    steady = 2.0 * w2 * variance / np.maximum(np.sqrt(w2 * w2 + 4.0 * w2 * variance) + w2, 1e-300)
    wandering = np.maximum(np.sqrt(steady) * WANDERING_PER_SD, wander * PER_WANDER)
    return np.where(wander > 0.0, wandering, still)


def on_ladder(spacing: FloatArray) -> FloatArray:
    """The largest power of sqrt(2) that is not above the spacing."""
    return np.exp2(np.floor(2.0 * np.log2(spacing) + 1e-9) / 2.0)


def reach(log_level: float | FloatArray, dispersion: FloatArray, sds: float) -> FloatArray:
    """Distance in the log level that `sds` standard deviations of one count's log span, bounded."""
    return np.minimum(sds * np.sqrt(count_variance(log_level, dispersion)), WIDEST_REACH)


def resolvable_dispersion(
    spacing: FloatArray, highest_log_level: FloatArray, dispersion: FloatArray
) -> FloatArray:
    """The dispersions, lowered where a grid is too coarse to show how narrow the likelihood is.

    Parameters
    ----------
    spacing : ndarray, shape (pairs,)
        Spacing of each pair's grid.
    highest_log_level : ndarray, shape (pairs,)
        Highest log level of each grid, where the likelihood is narrowest.
    dispersion : ndarray, shape (pairs,)
        The dispersions.

    Returns
    -------
    ndarray, shape (pairs,)
        On a grid as fine as `widest_spacing` asks, the dispersions unchanged. On a coarser one (a jump over
        many powers of ten, a bound on the nodes) the count is taken as less informative than it is, rather
        than falling between two nodes.
    """
    least = (spacing / STILL_PER_SD) ** 2 - np.exp(-highest_log_level)
    inverse = 1.0 / dispersion
    return np.where(least > inverse, 1.0 / np.maximum(least, 1e-300), dispersion)
