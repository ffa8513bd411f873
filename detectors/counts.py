"""The negative binomial: probability of a count, its distribution function, an uncertain exposure.

It is evaluated in saddle-point form (Loader 2000): a term that depends on the count and the dispersion only,
less a deviance that is the sum of two terms of at least 0. Differences of log gamma functions would lose
seven digits at counts of a billion.
"""

import math
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import betainc, betaincc, gammaincc, gammaln

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]

_POISSON = 1e300
"""Stands in for an infinite dispersion: finite, and every correction of the order 1 / dispersion vanishes."""

_HALF_LOG_TWO_PI = 0.5 * math.log(2.0 * math.pi)
_NEAR = 0.012
"""Below this w = (x - M) / (x + M) the deviance is a series; above it, a logarithm is accurate enough."""
_ABOVE_MINUS_ONE = -1.0 + 2.0**-53
"""Keeps the logarithm finite where the count is nothing beside its mean."""


def log_negative_binomial(count: ArrayLike, mean: ArrayLike, dispersion: ArrayLike) -> FloatArray:
    """Log probability of counts under negative-binomial laws with variance mean + mean^2 / dispersion.

    Parameters
    ----------
    count : array_like
        Counts, whole numbers from 0 to 2^53.
    mean : array_like
        Means, above 0.
    dispersion : array_like
        Dispersions, above 0; infinity is the Poisson law.

    Returns
    -------
    ndarray
        Natural logarithms; the three arguments are broadcast against each other.

    Notes
    -----
    log p = -D + stirling(r + x) - stirling(r) - stirling(x) - log(2 pi x) / 2 - log(1 + x / r) / 2 with
    D = bd0(x, M) + bd0(r, R), M = m (r + x) / (r + m), R = r (r + x) / (r + m),
    bd0(a, b) = a log(a / b) + b - a. Here a - b is known without cancellation:
    x - M = R - r = r (x - m) / (r + m).

    References
    ----------
    Loader (2000), Fast and accurate computation of binomial probabilities: the saddle-point form, its
    Stirling error and deviance; here with a number of successes that need not be whole.

    Examples
    --------
    >>> log_negative_binomial(12, 12.5, [4.0, np.inf]).round(6).tolist()
    [-2.879547, -2.178471]
    """
    x = np.asarray(count, dtype=np.float64)
    m = np.asarray(mean, dtype=np.float64)
    r = np.minimum(np.asarray(dispersion, dtype=np.float64), _POISSON)
    m_and_r = np.stack(np.broadcast_arrays(x, m, r)[1:])
    return _peak(x, r, _stirling_error(r)) - _deviance(x, m_and_r)


@dataclass(frozen=True, eq=False)
class NegativeBinomialRows:
    """Many negative-binomial laws at many means, that one count after another is held against.

    What depends on the dispersion alone is computed once for each law.

    Attributes
    ----------
    mean : ndarray, shape (rows,)
        Means at exposure 1, above 0.
    dispersion : ndarray, shape (laws,)
        Dispersions, above 0; infinity is the Poisson law.
    law : ndarray of int, shape (rows,)
        The law of each row.

    Examples
    --------
    >>> rows = NegativeBinomialRows(np.array([6.25, 6.25]), np.array([4.0, np.inf]), np.array([0, 1]))
    >>> rows.log_probability(12, exposure=2.0).round(6).tolist()
    [-2.879547, -2.178471]
    """

    mean: FloatArray
    dispersion: FloatArray
    law: IntArray
    _m_and_r: FloatArray = field(init=False, repr=False)
    _stirling_r: FloatArray = field(init=False, repr=False)

    def __post_init__(self) -> None:
        r = np.minimum(self.dispersion, _POISSON)
        object.__setattr__(self, "_m_and_r", np.stack((self.mean, r.take(self.law))))
        object.__setattr__(self, "_stirling_r", _stirling_error(r))

    def log_probability(self, count: int | FloatArray, exposure: float | FloatArray = 1.0) -> FloatArray:
        """Log probability of a count under every law.

        Parameters
        ----------
        count : int, or ndarray of shape (laws,)
            The count, from 0 to 2^53: one for all, or one a law.
        exposure : float, or ndarray of shape (rows,)
            Factor on the means, above 0.

        Returns
        -------
        ndarray, shape (rows,)
            Natural logarithms, the same as `log_negative_binomial` gives.
        """
        x = np.asarray(count, dtype=np.float64)
        m_and_r = self._m_and_r
        if isinstance(exposure, np.ndarray) or exposure != 1.0:
            m_and_r = np.stack((m_and_r[0] * exposure, m_and_r[1]))
        peak = _peak(x, np.minimum(self.dispersion, _POISSON), self._stirling_r)
        deviance = _deviance(x.take(self.law) if x.ndim else x, m_and_r)
        log_p: FloatArray = peak.take(self.law) - deviance
        return log_p


def _peak(x: FloatArray, r: FloatArray, stirling_r: FloatArray) -> FloatArray:
    """The part of log p that depends on count and dispersion only; 0 for a count of 0."""
    positive = np.maximum(x, 1.0)
    peak = _stirling_error(r + positive) - stirling_r - _stirling_error(positive)
    peak -= 0.5 * np.log(positive * (1.0 + positive / r)) + _HALF_LOG_TWO_PI
    return np.where(x == 0.0, 0.0, peak)


def _deviance(x: FloatArray, m_and_r: FloatArray) -> FloatArray:
    """bd0(x, M) + bd0(r, R), both at least 0; `m_and_r` has shape (2, ...)."""
    m, r = m_and_r
    total = m + r
    excess = np.empty_like(m_and_r)
    np.multiply(x - m, r / total, out=excess[0, ...])
    np.negative(excess[0], out=excess[1, ...])
    expected = m_and_r * ((r + x) / total)
    found = np.empty_like(m_and_r)
    found[0], found[1] = x, r
    both = _bd0(found, expected, excess)
    total_deviance: FloatArray = both[0] + both[1]
    return total_deviance


def _bd0(a: FloatArray, b: FloatArray, a_less_b: FloatArray) -> FloatArray:
    """a log(a / b) + b - a, given a - b to full precision."""
    # a log(a / b) as a log(1 + u): its rounding error grows with a - b instead of with a.
    far = a * np.log1p(np.maximum(a_less_b / b, _ABOVE_MINUS_ONE))
    far -= a_less_b
    w = a_less_b / (a + b)
    square = w * w
    near = square * (2.0 / 7.0)
    near += 2.0 / 5.0
    near *= square
    near += 2.0 / 3.0
    near *= square
    near *= a
    near += a_less_b
    near *= w
    return np.where(square < _NEAR * _NEAR, near, far)


_STIRLING = (1 / 12, -1 / 360, 1 / 1260, -1 / 1680, 1 / 1188, -691 / 360360, 1 / 156, -3617 / 122400)
_SERIES_FROM = 10.0


def _stirling_error(n: FloatArray) -> FloatArray:
    """log Gamma(n + 1) - (n + 1/2) log n + n - log(2 pi) / 2 for n above 0 (Stirling's series from 10 on)."""
    inverse = 1.0 / np.maximum(n, _SERIES_FROM)
    square = inverse * inverse
    series = square * _STIRLING[-1]
    for coefficient in _STIRLING[-2:0:-1]:
        series += coefficient
        series *= square
    series = (series + _STIRLING[0]) * inverse
    small = n < _SERIES_FROM
    if not small.any():
        return series
    few = np.minimum(n, _SERIES_FROM)
    direct = gammaln(few + 1.0) - (few + 0.5) * np.log(few) + few - _HALF_LOG_TWO_PI
    return np.where(small, direct, series)


def effective_dispersion(dispersion: ArrayLike, relative_sd: float | FloatArray) -> FloatArray:
    """Dispersion of a count whose exposure is itself uncertain.

    With exposure factor E of mean 1 and variance c^2, Var = m + m^2 / r (1 + c^2) + m^2 c^2, hence
    1 / (1/r + c^2 + c^2/r). Errors of a development factor are common to all counts of one age; taking them
    as independent is an approximation.

    Parameters
    ----------
    dispersion : array_like
        Dispersions r at a known exposure, above 0; infinity is the Poisson law.
    relative_sd : float or ndarray
        Relative standard deviation c of the exposure, at least 0; an array is broadcast.

    Returns
    -------
    ndarray
        Dispersions, same shape.

    Examples
    --------
    >>> effective_dispersion([4.0, np.inf], 0.5).round(6).tolist()
    [1.777778, 4.0]
    """
    inverse = 1.0 / np.asarray(dispersion, dtype=np.float64)
    variance = relative_sd * relative_sd
    total = inverse + variance * (1.0 + inverse)
    return np.divide(1.0, total, out=np.full_like(total, math.inf), where=total > 0.0)


def negative_binomial_cdf(
    count: ArrayLike, mean: ArrayLike, dispersion: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """Distribution function below and at a count, the pair of a probability integral transform.

    Parameters
    ----------
    count, mean, dispersion : array_like
        As for `log_negative_binomial`.

    Returns
    -------
    below, up_to : ndarray
        P(X < count) and P(X <= count), broadcast.

    References
    ----------
    Czado, Gneiting & Held (2009), Predictive model assessment for count data, Biometrics 65, 1254-1261.

    Examples
    --------
    >>> [round(float(p), 6) for p in negative_binomial_cdf(5, 12.5, 4.0)]
    [0.103594, 0.151858]
    """
    x, m, r = np.broadcast_arrays(
        np.asarray(count, dtype=np.float64),
        np.asarray(mean, dtype=np.float64),
        np.minimum(np.asarray(dispersion, dtype=np.float64), _POISSON),
    )
    below = np.zeros(x.shape)
    # The smaller of p and 1 - p is the one known to full precision.
    some = x > 0.0
    poisson = some & (r >= _POISSON)
    clustered = some & ~poisson & (r < m)
    spread = some & ~poisson & (r >= m)
    below[poisson] = gammaincc(x[poisson], m[poisson])
    below[clustered] = betainc(r[clustered], x[clustered], r[clustered] / (r + m)[clustered])
    below[spread] = betaincc(x[spread], r[spread], m[spread] / (r + m)[spread])
    # One special function is enough: adding what lies between is exact, and four times faster.
    up_to = np.minimum(below + np.exp(log_negative_binomial(x, m, r)), 1.0)
    return below, up_to
