"""Level and recurring factors of a series together, for given spreads: the inner part of the pattern."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import cho_factor, cho_solve, cho_solve_banded, cholesky_banded

from detectors.counts import log_negative_binomial
from detectors.one_off import log_one_off, mixture, one_off_cdf

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]

STEP_FREEDOM = 3.0
"""Degrees of freedom of the level's steps: heavy tails, so that a shift stays a step and is not smoothed."""
FIRST_SD = 3.0
"""Prior standard deviation of the first log level around its start."""
_MOST_ROUNDS = 40
_MOST_HALVINGS = 6
_LARGEST_MOVE = 2.0
_STILL = 1e-5
_POISSON = 1e9


@dataclass(frozen=True, eq=False)
class Series:
    """Counts with what is known of each; missing counts are left out.

    Attributes
    ----------
    counts, exposure : ndarray, shape (n,)
        Counts and their exposures.
    gaps : ndarray, shape (n - 1,)
        Positions from each count to the next.
    member : ndarray, shape (n, columns)
        1 where a count carries a factor, else 0.
    log_first : float
        About where the log level begins: the centre of its wide prior.
    """

    counts: FloatArray
    exposure: FloatArray
    gaps: FloatArray
    member: FloatArray
    log_first: float


@dataclass(frozen=True, eq=False)
class Spreads:
    """The spreads that are held fixed in a fit.

    Attributes
    ----------
    dispersion : float
        Dispersion of the counts.
    wander : float
        Scale of the log level's steps per unit of position.
    factor_sd : ndarray, shape (columns,)
        Prior standard deviation of each log factor, above 0.
    one_off_share, one_off_tail : float
        As in `detectors.model`.
    """

    dispersion: float
    wander: float
    factor_sd: FloatArray
    one_off_share: float
    one_off_tail: float


@dataclass(frozen=True, eq=False)
class Path:
    """Log level at each count and the log factors.

    Attributes
    ----------
    log_level : ndarray, shape (n,)
    log_factor : ndarray, shape (columns,)
    """

    log_level: FloatArray
    log_factor: FloatArray


@dataclass(frozen=True, eq=False)
class Fit:
    """The most probable path under given spreads.

    Attributes
    ----------
    path : Path
        Log level and log factors.
    covariance : ndarray, shape (columns, columns)
        Of the log factors, the level integrated out.
    log_evidence : float
        Laplace's approximation to the log probability of the counts under these spreads.
    one_off : ndarray, shape (n,)
        Probability that each count was a one-off.
    """

    path: Path
    covariance: FloatArray
    log_evidence: float
    one_off: FloatArray


@dataclass(frozen=True, eq=False)
class _Local:
    """Slope and curvature of the log posterior: a banded block of levels, bordered by the factors."""

    slope_level: FloatArray
    slope_factor: FloatArray
    banded: FloatArray
    border: FloatArray
    corner: FloatArray


def fit(series: Series, spreads: Spreads, start: Path) -> Fit:
    """Find the most probable level path and factors.

    Parameters
    ----------
    series : Series
        The counts.
    spreads : Spreads
        What is held fixed.
    start : Path
        Where to begin.

    Returns
    -------
    Fit

    Notes
    -----
    log p = sum_t log((1 - eps) NB(x_t; m_t, r) + eps Q(x_t; m_t)) + sum_t log t_3(l_t - l_{t-1}; wander
    sqrt(gap)) + sum_j log N(b_j; 0, sd_j^2), log m_t = log e_t + l_t + sum of its b_j. Newton steps with
    expected curvature: a count weighs with its probability of not being a one-off times the negative
    binomial's information m / (1 + m / r), a step of the level with 4 / (3 wander^2 gap + step^2). The
    levels' block is tridiagonal, so a step costs O(n columns^2). log evidence =
    log p + (n + columns) / 2 log 2 pi - log det(curvature) / 2.
    """
    path, reached = start, log_posterior(series, spreads, start)
    for _ in range(_MOST_ROUNDS):
        move = _newton(_local(series, spreads, path))
        path, gained = _along(series, spreads, path, move, reached)
        reached += gained
        if gained <= _STILL:
            break
    local = _local(series, spreads, path)
    chol, schur = _factored(local)
    log_det = 2.0 * float(np.log(chol[-1]).sum()) + 2.0 * float(np.log(np.diag(schur[0])).sum())
    size = local.slope_level.size + local.slope_factor.size
    return Fit(
        path=path,
        covariance=cho_solve(schur, np.eye(local.slope_factor.size)),
        log_evidence=reached + 0.5 * size * math.log(2.0 * math.pi) - 0.5 * log_det,
        one_off=_chances(series, spreads, path)[1],
    )


def log_posterior(series: Series, spreads: Spreads, path: Path) -> float:
    """Log probability of the counts and of the path together."""
    log_p, _ = _chances(series, spreads, path)
    scale = spreads.wander * np.sqrt(series.gaps)
    nu = STEP_FREEDOM
    constant = math.lgamma((nu + 1) / 2) - math.lgamma(nu / 2) - 0.5 * math.log(nu * math.pi)
    steps = np.diff(path.log_level)
    log_steps = constant - np.log(scale) - (nu + 1) / 2 * np.log1p((steps / scale) ** 2 / nu)
    sd = spreads.factor_sd
    log_factors = -0.5 * (path.log_factor / sd) ** 2 - np.log(sd) - 0.5 * math.log(2.0 * math.pi)
    first = (path.log_level[0] - series.log_first) / FIRST_SD
    log_first = -0.5 * first * first - math.log(FIRST_SD) - 0.5 * math.log(2.0 * math.pi)
    return float(log_p.sum() + log_steps.sum() + log_factors.sum() + log_first)


def _mean(series: Series, path: Path) -> FloatArray:
    log_mean = np.log(series.exposure) + path.log_level + series.member @ path.log_factor
    return np.exp(np.clip(log_mean, -30.0, 45.0))


def _chances(series: Series, spreads: Spreads, path: Path) -> tuple[FloatArray, FloatArray]:
    """Log probability of each count, and its probability of being a one-off."""
    mean = _mean(series, path)
    ordinary = log_negative_binomial(series.counts, mean, spreads.dispersion)
    broad = log_one_off(series.counts, mean, spreads.one_off_tail)
    return mixture(ordinary, broad, spreads.one_off_share)


def _local(series: Series, spreads: Spreads, path: Path) -> _Local:
    mean = _mean(series, path)
    odd = _chances(series, spreads, path)[1]
    damped = 1.0 + mean / min(spreads.dispersion, _POISSON)
    below, up_to = one_off_cdf(series.counts, mean, spreads.one_off_tail)
    tail = spreads.one_off_tail
    slope = (1.0 - odd) * (series.counts - mean) / damped + odd * tail * (below + up_to - 1.0)
    weight = (1.0 - odd) * mean / damped + odd * tail * tail / 2.0
    steps = np.diff(path.log_level)
    stiffness = (STEP_FREEDOM + 1) / (STEP_FREEDOM * spreads.wander**2 * series.gaps + steps * steps)
    banded = np.zeros((2, mean.size))
    banded[1] = weight
    banded[1, :-1] += stiffness
    banded[1, 1:] += stiffness
    banded[1, 0] += FIRST_SD**-2
    banded[0, 1:] = -stiffness
    pull = stiffness * steps
    slope_level = slope.copy()
    slope_level[:-1] += pull
    slope_level[1:] -= pull
    slope_level[0] -= (path.log_level[0] - series.log_first) * FIRST_SD**-2
    precision = spreads.factor_sd**-2.0
    border = series.member * weight[:, None]
    return _Local(
        slope_level=slope_level,
        slope_factor=series.member.T @ slope - precision * path.log_factor,
        banded=banded,
        border=border,
        corner=series.member.T @ border + np.diag(precision),
    )


def _factored(local: _Local) -> tuple[FloatArray, tuple[FloatArray, bool]]:
    """Cholesky factors of the levels' block, and of what the factors know beyond it."""
    chol = cholesky_banded(local.banded)
    beyond = local.corner - local.border.T @ cho_solve_banded((chol, False), local.border)
    factor, lower = cho_factor(beyond)
    return chol, (factor, bool(lower))


def _newton(local: _Local) -> Path:
    chol, schur = _factored(local)
    free = cho_solve_banded((chol, False), local.slope_level)
    factor = cho_solve(schur, local.slope_factor - local.border.T @ free)
    level = free - cho_solve_banded((chol, False), local.border @ factor)
    return Path(level, factor)


def _along(series: Series, spreads: Spreads, path: Path, move: Path, reached: float) -> tuple[Path, float]:
    """Go along a move as far as it gains; where it never does, stay."""
    largest = max(float(np.abs(move.log_level).max()), float(np.abs(move.log_factor).max(initial=0.0)))
    share = min(1.0, _LARGEST_MOVE / largest) if largest > 0.0 else 0.0
    for _ in range(_MOST_HALVINGS):
        there = Path(path.log_level + share * move.log_level, path.log_factor + share * move.log_factor)
        gained = log_posterior(series, spreads, there) - reached
        if gained > 0.0:
            return there, gained
        share /= 2.0
    return path, 0.0
