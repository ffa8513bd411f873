"""Probabilities of a one-off count: a broad law, heavy on both sides of the level, and its mixture."""

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import expit

FloatArray = NDArray[np.float64]


def log_one_off(count: ArrayLike, mean: ArrayLike, tail: float) -> FloatArray:
    """Log probability of counts under the broad component that stands for one-offs.

    Parameters
    ----------
    count : array_like
        Counts, whole numbers from 0 to 2^53.
    mean : array_like
        Means of the ordinary law, above 0; the median of this one.
    tail : float
        Exponent beta of both tails, above 0.

    Returns
    -------
    ndarray
        Natural logarithms; `count` and `mean` are broadcast against each other.

    Notes
    -----
    The log-logistic distribution F(y) = 1 / (1 + (mean / y)^beta) between the edges x - 1/2 and x + 1/2, the
    lowest edge being 0. It sums to 1 exactly. At beta = 1, Q(0) = (1/2) / (m + 1/2) and
    Q(x) = m / ((m + x - 1/2) (m + x + 1/2)).

    Examples
    --------
    >>> np.exp(log_one_off([0, 1, 2], 0.5, 1.0)).round(6).tolist()
    [0.5, 0.25, 0.083333]
    """
    x = np.asarray(count, dtype=np.float64)
    m = np.asarray(mean, dtype=np.float64)
    if tail == 1.0:
        log_share: FloatArray = np.log(_closed_form(x, m))
        return log_share
    log_m = np.log(m)
    below_upper = -np.logaddexp(0.0, tail * (log_m - np.log(x + 0.5)))
    lower = np.maximum(x - 0.5, 0.5)
    above_lower = -np.logaddexp(0.0, tail * (np.log(lower) - log_m))
    between = np.log(-np.expm1(-tail * np.log1p(1.0 / lower)))
    return below_upper + np.where(x == 0.0, 0.0, above_lower + between)


def one_off_probability(count: ArrayLike, mean: ArrayLike, tail: float) -> FloatArray:
    """Probability of counts under the broad component; at tail 1 without a logarithm.

    Parameters
    ----------
    count, mean, tail
        As for `log_one_off`.

    Returns
    -------
    ndarray
        Probabilities; `count` and `mean` are broadcast against each other.

    Examples
    --------
    >>> one_off_probability([0, 1, 2], 0.5, 1.0).round(6).tolist()
    [0.5, 0.25, 0.083333]
    """
    if tail == 1.0:
        return _closed_form(np.asarray(count, dtype=np.float64), np.asarray(mean, dtype=np.float64))
    return np.exp(log_one_off(count, mean, tail))


def _closed_form(x: FloatArray, m: FloatArray) -> FloatArray:
    """m w / ((m + lower) (m + upper)) with w the width between the edges, a half at a count of 0."""
    width = np.where(x == 0.0, 0.5, 1.0)
    share: FloatArray = m / (m + np.maximum(x - 0.5, 0.0)) * (width / (m + (x + 0.5)))
    return share


def one_off_cdf(count: ArrayLike, mean: ArrayLike, tail: float) -> tuple[FloatArray, FloatArray]:
    """Distribution function of the broad component below and at a count.

    Parameters
    ----------
    count, mean, tail
        As for `log_one_off`.

    Returns
    -------
    below, up_to : ndarray
        P(X < count) and P(X <= count), broadcast.

    Examples
    --------
    >>> [round(float(p), 6) for p in one_off_cdf(1, 0.5, 1.0)]
    [0.5, 0.75]
    """
    x = np.asarray(count, dtype=np.float64)
    m = np.asarray(mean, dtype=np.float64)
    # Below a count of 0 there is nothing; at an edge of 0 both forms give exactly that.
    lower, upper = np.maximum(x - 0.5, 0.0), x + 0.5
    if tail == 1.0:
        return lower / (lower + m), upper / (upper + m)
    log_m = np.log(m)
    with np.errstate(divide="ignore"):
        below = expit(tail * (np.log(lower) - log_m))
    return below, expit(tail * (np.log(upper) - log_m))


def mixture(log_ordinary: FloatArray, log_broad: FloatArray, share: float) -> tuple[FloatArray, FloatArray]:
    """Log probability of a count that is a one-off with a small probability, and whether it was one.

    Parameters
    ----------
    log_ordinary, log_broad : ndarray
        Log probabilities under the ordinary and the broad law, same shape; finite.
    share : float
        Prior probability eps of a one-off, from 0 to below 1.

    Returns
    -------
    log_probability : ndarray
        log((1 - eps) exp(log_ordinary) + eps exp(log_broad)), same shape.
    one_off : ndarray
        Posterior probability that the count came from the broad law, same shape.

    Examples
    --------
    >>> log_p, one_off = mixture(np.log([0.1]), np.log([0.3]), 0.25)
    >>> np.exp(log_p).round(6).tolist(), one_off.round(6).tolist()
    ([0.15], [0.5])
    """
    if share == 0.0:
        return log_ordinary, np.zeros_like(log_ordinary)
    ordinary = log_ordinary + math.log1p(-share)
    broad = log_broad + math.log(share)
    larger = np.maximum(ordinary, broad)
    log_p = larger + np.log1p(np.exp(np.minimum(ordinary, broad) - larger))
    return log_p, np.exp(broad - log_p)
