"""What the filter expected of a count: the predictive distribution function just below it and at it."""

import numpy as np
from numpy.typing import NDArray
from scipy import special

from detectors.bench import Bench
from detectors.counts import effective_dispersion
from detectors.filter_state import Step
from detectors.observation import Observation
from detectors.one_off import one_off_cdf

FloatArray = NDArray[np.float64]


def transform(bench: Bench, step: Step, observation: Observation) -> tuple[float, float]:
    """Probability integral transform of a count, F(x - 1) and F(x).

    Parameters
    ----------
    bench : Bench
        The grids on which the step was made.
    step : Step
        The step.
    observation : Observation
        The count; not a missing one.

    Returns
    -------
    tuple of float
        Both from 0 to 1. The error of either is below 0.001: the distribution function of a negative binomial
        is integrated along each level grid from its slope, which is its probability up to a simple factor.

    Notes
    -----
    d F(x) / d log(level) = -m (r + x) / (r + m) p(x), with m the mean, r the dispersion.

    References
    ----------
    Czado, Gneiting & Held (2009), Predictive model assessment for count data, Biometrics 65, 1254-1261.
    """
    count = 0 if observation.count is None else observation.count
    likelihood = step.likelihood
    mean = bench.level * observation.exposure
    possible = likelihood.probability > 0.0
    predicted = np.divide(step.row_mass, likelihood.probability, out=np.zeros_like(mean), where=possible)
    predicted = predicted / predicted.sum()
    at = _along_grid(bench, observation, count, mean, likelihood.negative_binomial)
    below = np.maximum(at - likelihood.negative_binomial, 0.0)
    share = bench.model.one_off_share
    low, high = float(predicted @ below), float(predicted @ at)
    if share > 0.0:
        broad_low, broad_high = one_off_cdf(count, mean, bench.model.one_off_tail)
        low = (1.0 - share) * low + share * float(predicted @ broad_low)
        high = (1.0 - share) * high + share * float(predicted @ broad_high)
    low = min(max(low, 0.0), 1.0)
    return low, min(max(high, low), 1.0)


def _along_grid(
    bench: Bench, observation: Observation, count: int, mean: FloatArray, probability: FloatArray
) -> FloatArray:
    """P(X <= count) at each row, by Hermite's rule from the exact value at each pair's lowest node."""
    grid = bench.grid
    dispersion = bench.row_dispersion
    if observation.relative_sd > 0.0:
        dispersion = effective_dispersion(dispersion, observation.relative_sd)
    spread = 1.0 + mean / dispersion
    slope = -mean * (1.0 + count / dispersion) / spread * probability
    bend = slope * (1.0 + count - mean) / spread
    spacing = grid.spread(grid.spacing)
    rise = np.zeros_like(mean)
    rise[1:] = spacing[1:] / 2.0 * (slope[:-1] + slope[1:]) + spacing[1:] ** 2 / 12.0 * (bend[:-1] - bend[1:])
    rise[grid.start] = 0.0
    running = np.cumsum(rise)
    lowest = _up_to(count, mean[grid.start], dispersion[grid.start])
    result = running + grid.spread(lowest - running[grid.start])
    return np.minimum(np.maximum(result, probability), 1.0)


def _up_to(count: int, mean: FloatArray, dispersion: FloatArray) -> FloatArray:
    """P(X <= count) for a few means, straight from the special functions."""
    poisson = np.isinf(dispersion)
    finite = np.where(poisson, 1.0, dispersion)
    share = special.betainc(finite, count + 1.0, finite / (finite + mean))
    if poisson.any():
        share = np.where(poisson, special.gammaincc(count + 1.0, mean), share)
    return np.asarray(share, dtype=np.float64)
