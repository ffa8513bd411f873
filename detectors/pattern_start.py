"""A first guess at level and factors, from medians, from which the fit begins."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from detectors.observation import Observation
from detectors.pattern_fit import Path, Series

FloatArray = NDArray[np.float64]

_LEAST_COUNT = 0.5
"""Stands for a count of 0 on the log scale."""


def start_level(counts: FloatArray, exposure: FloatArray, window: int) -> FloatArray:
    """Log of the running median of the rates, over about one turn of the longest cycle.

    Parameters
    ----------
    counts, exposure : ndarray, shape (n,)
        Counts and exposures.
    window : int
        Length of the window in counts; at both ends it is cut short.

    Returns
    -------
    ndarray, shape (n,)

    Examples
    --------
    >>> rates = np.array([1.0, 1.0, 9.0, 1.0, 4.0, 4.0, 4.0])
    >>> np.exp(start_level(rates, np.ones(7), 3)).round(1).tolist()
    [1.0, 1.0, 1.0, 4.0, 4.0, 4.0, 4.0]
    """
    rates = np.maximum(counts, _LEAST_COUNT) / exposure
    half = max(window // 2, 1)
    padded = np.pad(rates, half, constant_values=np.nan)
    windows = np.lib.stride_tricks.sliding_window_view(padded, 2 * half + 1)
    level: FloatArray = np.log(np.nanmedian(windows, axis=1))
    return level


def begin(observations: Sequence[Observation], member: FloatArray, window: int) -> tuple[Series, Path]:
    """The series of some counts, none missing, and where its fit begins.

    Parameters
    ----------
    observations : sequence of Observation
        The counts.
    member : ndarray, shape (n, columns)
        1 where a count carries a factor, else 0.
    window : int
        Length of the longest cycle in counts.

    Returns
    -------
    series : Series
    start : Path
        The level, and for each factor the median log ratio of its counts to the level.
    """
    counts = np.array([observation.count for observation in observations], dtype=np.float64)
    exposure = np.array([observation.exposure for observation in observations])
    gaps = np.diff([float(observation.position) for observation in observations])
    log_level = start_level(counts, exposure, window)
    ratio = np.log(np.maximum(counts, _LEAST_COUNT) / exposure) - log_level
    log_factor = np.zeros(member.shape[1])
    for column in range(log_factor.size):
        carries = member[:, column] > 0.0
        if carries.any():
            log_factor[column] = np.median(ratio[carries])
    return Series(counts, exposure, gaps, member, float(log_level[0])), Path(log_level, log_factor)
