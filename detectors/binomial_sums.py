"""Sums of binomial probabilities behind the gap prior: successes had, successes still needed.

A run ends with the `shape`-th success of independent trials with chance `p`. Every term of every sum is
positive, so nothing cancels however old the run or long the gap.
"""

import math
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from detectors.errors import UnusableParameter

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_SMALLEST_TABLE = 1024
_LARGEST_TABLE = 1 << 19


@lru_cache(maxsize=256)
def chance_within(shape: int, p: float, gap: int) -> FloatArray:
    """Chance that a run which still needs 1 .. shape successes has them within the gap, shape (shape,)."""
    if gap < 1:
        raise UnusableParameter("gap", gap, "a whole number of at least 1")
    if p == 1.0:
        done = np.where(np.arange(1, shape + 1) <= gap, 1.0, 0.0)
    else:
        terms = np.exp(log_successes(shape, p, np.asarray(gap)))
        fewer = np.cumsum(terms)[:shape]
        at_least = np.cumsum(terms[::-1])[::-1][1 : shape + 1]
        done = np.where(fewer < 0.5, 1.0 - fewer, at_least)
        done[0] = -math.expm1(gap * math.log1p(-p))
    done.flags.writeable = False
    return done


def log_successes(shape: int, p: float, trials: IntArray) -> FloatArray:
    """log P(i successes in so many trials), i = 0, 1, ... on the last axis, for p below 1.

    It goes so far beyond `shape` that what follows adds nothing to the tail beyond `shape` or less, unless
    that tail is more than half: the terms fall like exp(-j^2 / (2 (shape + j))) and faster.
    """
    had = np.arange(shape + math.ceil(12.0 * math.sqrt(shape)) + 40)
    left = np.maximum(trials[..., None] - had, 0)
    ratio = left / (had + 1.0) * (p / (1.0 - p))
    with np.errstate(divide="ignore"):
        log_ratio = np.log(ratio)
    log_terms = np.zeros((*trials.shape, had.size + 1))
    np.cumsum(log_ratio, axis=-1, out=log_terms[..., 1:])
    log_terms += trials[..., None] * math.log1p(-p)
    return log_terms


def log_sum(log_terms: FloatArray) -> FloatArray:
    largest = log_terms.max(axis=-1)
    summed: FloatArray = np.log(np.exp(log_terms - largest[..., None]).sum(axis=-1)) + largest
    return summed


def successes_needed(shape: int, p: float, ages: IntArray) -> FloatArray:
    """Distribution of the successes that an ordinary run of each age still needs, shape (..., shape).

    Column m - 1 stands for m successes. A run of age a has had i = shape - m of them with a probability in
    proportion to C(a, i) (p / q)^i.
    """
    return _at_ages(shape, p, ages, 0)


def first_successes_needed(shape: int, p: float, ages: IntArray) -> FloatArray:
    """The same for the first run, which needed 1 .. shape of them with equal probability when first watched.

    It has had i of `shape` with a probability in proportion to the sum of an ordinary run's terms up to i.
    """
    return _at_ages(shape, p, ages, 1)


def _at_ages(shape: int, p: float, ages: IntArray, kind: int) -> FloatArray:
    if ages.size == 0:
        return np.empty((*ages.shape, shape))
    oldest = int(ages.max())
    if ages.min() < 0:
        raise UnusableParameter("age", int(ages.min()), "at least 0")
    size = max(_SMALLEST_TABLE, 1 << oldest.bit_length())
    if size * shape > _LARGEST_TABLE:
        return _still_needed(shape, p, ages)[kind]
    rows: FloatArray = _table(shape, p, size)[kind].take(ages, axis=0)
    return rows


@lru_cache(maxsize=16)
def _table(shape: int, p: float, size: int) -> tuple[FloatArray, FloatArray]:
    """Distributions of the successes still needed at the ages 0 .. size - 1, for reading only."""
    tables = _still_needed(shape, p, np.arange(size))
    for table in tables:
        table.flags.writeable = False
    return tables


def _still_needed(shape: int, p: float, ages: IntArray) -> tuple[FloatArray, FloatArray]:
    """Distributions of the successes still needed at each age, of an ordinary and of the first run."""
    by_had = _binomial_weights(shape, p, ages)
    first = np.cumsum(by_had, axis=-1)
    return _normalised(by_had[..., ::-1]), _normalised(first[..., ::-1])


def _normalised(weights: FloatArray) -> FloatArray:
    shares: FloatArray = weights / weights.sum(axis=-1, keepdims=True)
    return np.ascontiguousarray(shares)


def _binomial_weights(shape: int, p: float, ages: IntArray) -> FloatArray:
    """C(a, i) (p / q)^i for i = 0 .. shape - 1, divided by the largest of them, shape (..., shape).

    Products of neighbours' ratios run from the largest term outwards, so none can overflow.
    """
    weights = np.ones((*ages.shape, shape))
    had = np.arange(shape - 1)
    odds = p / max(1.0 - p, 1e-300)
    ratio = np.maximum(ages[..., None] - had, 0) / (had + 1.0) * odds
    weights[..., 1:] = np.cumprod(np.minimum(ratio, 1.0), axis=-1)
    rising = 1.0 / np.maximum(ratio, 1.0)
    weights[..., :-1] *= np.cumprod(rising[..., ::-1], axis=-1)[..., ::-1]
    return weights
