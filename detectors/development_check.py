"""Whether one release bends a stream's development factors, and which."""

import math
from dataclasses import dataclass

import numpy as np

from detectors.development import Development, FloatArray, chain_ladder, usable
from detectors.growth_triangle import Triangle

FEWEST_ROWS = 5
"""With fewer releases a median and a spread tell nothing of one of them."""
FAR = 4.5
"""Robust standard deviations from the median at which a release's growth is one of its own."""
LEAST_SPREAD = 0.01
"""Growth factors are never taken to agree to better than 1 %."""
MEDIAN_ERRORS = 3.0
"""Standard errors of the median by which a factor may lie beside it."""

_MAD_TO_SD = 1.4826
_MEDIAN_ERROR = 1.2533
"""Standard error of a median: sqrt(pi / 2) standard deviations over sqrt(n), for normal values."""


@dataclass(frozen=True, slots=True)
class OneOffGrowth:
    """A release that grew in one step quite unlike the others.

    Attributes
    ----------
    row, step : int
        Its row in the triangle, and the step.
    factor, median : float
        Its own factor, and the median of all rows' factors in that step.
    score : float
        How many robust standard deviations lie between them, on the log scale.
    """

    row: int
    step: int
    factor: float
    median: float
    score: float


@dataclass(frozen=True, slots=True)
class MedianCheck:
    """A step's factor beside the median of its rows' factors.

    Attributes
    ----------
    step : int
        The step.
    factor : float or None
        The factor in use.
    median : float or None
        Median of the rows' own factors, each release weighing the same.
    median_error : float or None
        Its standard error.
    heaviest_share : float
        Share of the earlier cells that one release has: near 1, the factor is that release's.
    disagrees : bool
        Whether the two lie more than `MEDIAN_ERRORS` standard errors of the median apart.
    """

    step: int
    factor: float | None
    median: float | None
    median_error: float | None
    heaviest_share: float
    disagrees: bool


def one_off_growth(triangle: Triangle) -> tuple[OneOffGrowth, ...]:
    """The releases whose growth in a step is unlike all others'.

    Parameters
    ----------
    triangle : Triangle
        The totals.

    Returns
    -------
    tuple of OneOffGrowth
        In order of step and row; none in steps known of fewer than `FEWEST_ROWS` releases.

    Notes
    -----
    A factor from sums weighs releases by size, so one huge release with a growth of its own (a late viral
    hit) carries it off. Row i is far if abs(log F_i - log M) > FAR sqrt(s^2 + (M - 1) / (M C_i)), with M the
    median factor, s the scaled median absolute deviation of the log factors (at least 1 %) and C_i the
    earlier cell: the last term is the chance of counts, so that a release of few counts is not taken for odd.

    Examples
    --------
    >>> cells = np.array([[1000.0, 2000.0 + 20 * row] for row in range(8)] + [[1000.0, 40000.0]])
    >>> [(odd.row, odd.factor) for odd in one_off_growth(Triangle((1.0, 7.0), cells))]
    [(8, 40.0)]
    """
    found = []
    for step in range(len(triangle.ages) - 1):
        rows = np.flatnonzero(usable(triangle, step) & (triangle.counts[:, step + 1] > 0.0))
        if rows.size < FEWEST_ROWS:
            continue
        factor = triangle.counts[rows, step + 1] / triangle.counts[rows, step]
        score, median = _scores(factor, triangle.counts[rows, step])
        found += [
            OneOffGrowth(int(rows[k]), step, float(factor[k]), median, float(score[k]))
            for k in np.flatnonzero(score > FAR)
        ]
    return tuple(found)


def robust_chain_ladder(triangle: Triangle) -> Development:
    """The chain ladder without the steps of releases that grew quite unlike the others.

    The filter has a component of its own for such releases, so the factors are to describe the others.

    Examples
    --------
    >>> cells = np.array([[1000.0, 2000.0 + 20 * row] for row in range(8)] + [[1000.0, 40000.0]])
    >>> development = robust_chain_ladder(Triangle((1.0, 7.0), cells))
    >>> round(development.steps[0].factor, 2), development.left_out
    (2.07, ((8, 0),))
    """
    odd = one_off_growth(triangle)
    return chain_ladder(triangle, left_out=[(growth.row, growth.step) for growth in odd])


def median_check(triangle: Triangle, development: Development) -> tuple[MedianCheck, ...]:
    """Hold every factor against the median of the rows' own factors.

    Parameters
    ----------
    triangle : Triangle
        The totals.
    development : Development
        The factors in use; pairs that it leaves out are left out of `heaviest_share` only.

    Returns
    -------
    tuple of MedianCheck
        One a step.

    Examples
    --------
    >>> cells = np.array([[1000.0, 2000.0 + 20 * row] for row in range(8)] + [[1000.0, 40000.0]])
    >>> triangle = Triangle((1.0, 7.0), cells)
    >>> check = median_check(triangle, chain_ladder(triangle))[0]
    >>> check.disagrees, round(check.factor, 2), round(check.median, 2)
    (True, 6.28, 2.08)
    """
    return tuple(_one_check(triangle, development, step) for step in range(len(development.steps)))


def _one_check(triangle: Triangle, development: Development, step: int) -> MedianCheck:
    used = usable(triangle, step)
    cells = triangle.counts[used, step]
    kept = used.copy()
    kept[[row for row, place in development.left_out if place == step]] = False
    weights = triangle.counts[kept, step]
    share = float(weights.max() / weights.sum()) if weights.size else 0.0
    factor = development.steps[step].factor
    if not factor or cells.size < FEWEST_ROWS:
        return MedianCheck(step, factor, None, None, share, False)
    own = triangle.counts[used, step + 1] / cells
    median = float(np.median(own))
    if median == 0.0:
        return MedianCheck(step, factor, median, None, share, True)
    error = _MEDIAN_ERROR * _spread(own[own > 0.0], median) / math.sqrt(own.size)
    apart = abs(math.log(factor / median)) > max(MEDIAN_ERRORS * error, LEAST_SPREAD)
    return MedianCheck(step, factor, median, median * error, share, apart)


def _scores(factor: FloatArray, earlier: FloatArray) -> tuple[FloatArray, float]:
    median = float(np.median(factor))
    chance = max(median - 1.0, 0.0) / (median * earlier)
    scores: FloatArray = np.abs(np.log(factor / median)) / np.sqrt(_spread(factor, median) ** 2 + chance)
    return scores, median


def _spread(factor: FloatArray, median: float) -> float:
    """Robust standard deviation of the log factors, at least `LEAST_SPREAD`."""
    return max(_MAD_TO_SD * float(np.median(np.abs(np.log(factor / median)))), LEAST_SPREAD)
