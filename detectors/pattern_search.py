"""The spreads of a pattern: dispersion, wander and the spread of each group of factors, by their evidence."""

import dataclasses
import math
from collections.abc import Callable, Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from detectors.model import Model
from detectors.pattern_fit import Fit, Path, Series, Spreads, fit

FloatArray = NDArray[np.float64]

DISPERSIONS = (1.0, 2.0, 4.0, 8.0, 16.0, 32.0, 64.0, 128.0, 512.0, math.inf)
WANDERS = (0.002, 0.005, 0.01, 0.02, 0.04, 0.08, 0.16, 0.32)
FACTOR_SPREADS = (0.001, 0.02, 0.04, 0.08, 0.16, 0.32, 0.64, 1.28)
"""The first is as good as none: the factors are then 1."""
_PRIOR = np.array([len(FACTOR_SPREADS) - 1.0] + [1.0] * (len(FACTOR_SPREADS) - 1))
"""No pattern is as likely beforehand as any: little data of a flat stream should not bring one up."""
_SWEEPS = 3


@dataclasses.dataclass(frozen=True, eq=False)
class Factors:
    """The log factors of one group.

    Attributes
    ----------
    log_factor : ndarray, shape (places,)
    covariance : ndarray, shape (places, places)
    spread : float
        Standard deviation of log factors towards 0 of which they were shrunk.
    """

    log_factor: FloatArray
    covariance: FloatArray
    spread: float


def search(series: Series, groups: Sequence[int], model: Model, start: Path) -> tuple[Spreads, Fit]:
    """Find the spreads of the largest evidence, one after another, in a few sweeps.

    Parameters
    ----------
    series : Series
        The counts.
    groups : sequence of int
        Number of columns in each group of factors, in order.
    model : Model
        Whose one-off component is used.
    start : Path
        Where the fits begin.

    Returns
    -------
    spreads : Spreads
    fitted : Fit

    Notes
    -----
    The evidence is Laplace's (`pattern_fit.fit`), over the grids above. The walk along a grid stops at the
    first value that is worse than its neighbour, so it finds the mode nearest to a small wander with a
    pattern, which is the one meant: a large wander could follow any season without explaining it.
    """
    ends = np.cumsum(groups)
    first = Spreads(16.0, 0.02, np.full(int(ends[-1]), 0.16), model.one_off_share, model.one_off_tail)
    best = (first, fit(series, first, start))
    for _ in range(_SWEEPS):
        before = best[0]
        best = _walk(series, best, DISPERSIONS, lambda s: s.dispersion, _with_dispersion)
        best = _walk(series, best, WANDERS, lambda s: s.wander, _with_wander)
        for end, size in zip(ends.tolist(), groups, strict=True):
            columns = slice(end - size, end)
            best = _walk(series, best, FACTOR_SPREADS, _spread_of(columns), _with_factors(columns))
        if best[0] is before:
            break
    return best


def average(series: Series, groups: Sequence[int], best: tuple[Spreads, Fit]) -> tuple[Factors, ...]:
    """The factors of each group, averaged over its spread, the other spreads being the best ones.

    Parameters
    ----------
    series : Series
        The counts.
    groups : sequence of int
        Number of columns in each group of factors, in order.
    best : tuple of Spreads, Fit
        What `search` found.

    Returns
    -------
    tuple of Factors
        One a group.

    Notes
    -----
    The weight w of a value of the grid is its Laplace evidence times its prior: none at all is as likely as
    all others together, which are equal. Mean = sum w b, covariance = sum w (C + (b - mean)(b - mean)'). With
    few data the evidence hardly tells a small spread from none, and the best one alone would promise too
    much: in half the cases no pattern, and that with no error at all.
    """
    ends = np.cumsum(groups).tolist()
    return tuple(
        _averaged(series, slice(end - size, end), best) for end, size in zip(ends, groups, strict=True)
    )


def _averaged(series: Series, columns: slice, best: tuple[Spreads, Fit]) -> Factors:
    change = _with_factors(columns)
    fits = [fit(series, change(best[0], value), best[1].path) for value in FACTOR_SPREADS]
    log_evidence = np.array([fitted.log_evidence for fitted in fits])
    weight = _PRIOR * np.exp(log_evidence - log_evidence.max())
    weight /= weight.sum()
    log_factors = np.array([fitted.path.log_factor[columns] for fitted in fits])
    mean = weight @ log_factors
    covariance = np.einsum("k,ki,kj->ij", weight, log_factors - mean, log_factors - mean)
    for share, fitted in zip(weight, fits, strict=True):
        covariance += share * fitted.covariance[columns, columns]
    spread = math.sqrt(float(weight @ np.square(FACTOR_SPREADS)))
    return Factors(mean, covariance, spread)


Change = Callable[[Spreads, float], Spreads]


def _walk(
    series: Series,
    best: tuple[Spreads, Fit],
    grid: Sequence[float],
    value: Callable[[Spreads], float],
    change: Change,
) -> tuple[Spreads, Fit]:
    """Go up the evidence along one grid, from where it stands."""
    here = grid.index(value(best[0]))
    up = _climb(series, best, grid[here + 1 :], change)
    return up if up is not best else _climb(series, best, grid[:here][::-1], change)


def _climb(
    series: Series, best: tuple[Spreads, Fit], values: Iterable[float], change: Change
) -> tuple[Spreads, Fit]:
    for value in values:
        spreads = change(best[0], value)
        fitted = fit(series, spreads, best[1].path)
        if fitted.log_evidence <= best[1].log_evidence:
            break
        best = (spreads, fitted)
    return best


def _with_dispersion(spreads: Spreads, value: float) -> Spreads:
    return dataclasses.replace(spreads, dispersion=value)


def _with_wander(spreads: Spreads, value: float) -> Spreads:
    return dataclasses.replace(spreads, wander=value)


def _spread_of(columns: slice) -> Callable[[Spreads], float]:
    return lambda spreads: float(spreads.factor_sd[columns][0])


def _with_factors(columns: slice) -> Change:
    def change(spreads: Spreads, value: float) -> Spreads:
        factor_sd = spreads.factor_sd.copy()
        factor_sd[columns] = value
        return dataclasses.replace(spreads, factor_sd=factor_sd)

    return change
