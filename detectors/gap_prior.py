"""The prior of the length of a run, and the hazard that follows from it.

A run ends with the `shape`-th success of independent trials, one trial per unit of position. A run of a
known age that goes on is a mixture of "still needs 1, 2, ..., `shape` successes", and the chance that it
ends within a gap is the same mixture of binomial tails. Every term is positive, so nothing cancels however
old the run or long the gap.
"""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from detectors.binomial_sums import (
    chance_within,
    first_successes_needed,
    log_successes,
    log_sum,
    successes_needed,
)
from detectors.errors import UnusableParameter

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class GapPrior:
    """Negative-binomial prior of the length G of a run, counted in trials.

    P(G = t) = C(t-1, k-1) p^k (1-p)^(t-k) for t = k, k+1, ..., with k = `shape` and p = `shape` / `mean`.
    Shape 1 is the constant hazard; from 2 on a shift right after a shift is unlikely.

    The first run of a stream began before anyone watched, so what is left of it has the equilibrium
    distribution, P(R > a) = sum_{g >= a} S(g) / sum_{g >= 0} S(g) with S(g) = P(G > g). The methods whose
    name begins with `first` are about that run.

    Attributes
    ----------
    shape : int
        Number of successes k that ends a run, at least 1.
    mean : float
        Mean length of a run in units of position, finite and at least `shape`.

    Raises
    ------
    UnusableParameter
        If `shape` or `mean` is outside its range.

    References
    ----------
    Fearnhead (2006), Exact and efficient Bayesian inference for multiple changepoint problems, Statistics
    and Computing 16, 203-213. Fearnhead & Liu (2007), On-line inference for multiple changepoint problems,
    JRSS B 69, 589-605.

    Examples
    --------
    >>> GapPrior(shape=2, mean=20.0).hazard([1, 2, 10]).round(6).tolist()
    [0.0, 0.01, 0.05]
    """

    shape: int
    mean: float

    def __post_init__(self) -> None:
        if isinstance(self.shape, bool) or not isinstance(self.shape, int) or self.shape < 1:
            raise UnusableParameter("shape", self.shape, "a whole number of at least 1")
        if not self.shape <= self.mean < math.inf:
            raise UnusableParameter("mean", self.mean, f"a finite number of at least the shape, {self.shape}")

    @property
    def p(self) -> float:
        """Chance of a success at one trial, `shape` / `mean`: what the hazard of an old run tends to."""
        return self.shape / self.mean

    def hazard(self, t: ArrayLike) -> FloatArray:
        """Hazard of an ordinary run, h(t) = P(G = t | G >= t).

        Parameters
        ----------
        t : array_like of int
            Lengths, at least 1, any shape.

        Returns
        -------
        ndarray
            Probabilities, same shape; 0 below `shape`.

        Examples
        --------
        >>> GapPrior(shape=1, mean=50.0).hazard([1, 1000]).tolist()
        [0.02, 0.02]
        """
        return self.shift_within(np.asarray(t, dtype=np.int64) - 1, 1)

    def first_hazard(self, t: ArrayLike) -> FloatArray:
        """Hazard of the first run, h0(t) = p S_k(t-1) / sum_{i <= k} S_i(t-1).

        S_i is the survival of the i-th success.

        Parameters
        ----------
        t : array_like of int
            Lengths since the stream was first watched, at least 1, any shape.

        Returns
        -------
        ndarray
            Probabilities, same shape.

        Examples
        --------
        >>> GapPrior(shape=2, mean=20.0).first_hazard([1, 3]).round(6).tolist()
        [0.05, 0.055]
        """
        return self.first_shift_within(np.asarray(t, dtype=np.int64) - 1, 1)

    def shift_within(self, age: ArrayLike, gap: int) -> FloatArray:
        """Chance H(a, d) = 1 - S(a + d) / S(a) that an ordinary run ends within the next gap.

        Parameters
        ----------
        age : array_like of int
            Ages a of runs in units of position, at least 0, any shape: position now less position of the
            run's first observation.
        gap : int
            Gap d to the next observation, at least 1.

        Returns
        -------
        ndarray
            Probabilities, same shape as `age`.

        Raises
        ------
        UnusableParameter
            If an age is negative or the gap is below 1.

        Examples
        --------
        >>> GapPrior(shape=2, mean=50.0).shift_within([0, 10], 7).round(6).tolist()
        [0.02938, 0.093843]
        """
        ages = np.asarray(age, dtype=np.int64)
        needed = successes_needed(self.shape, self.p, ages)
        return _as_chance(needed @ chance_within(self.shape, self.p, gap))

    def first_shift_within(self, age: ArrayLike, gap: int) -> FloatArray:
        """Chance that the first run ends within the next gap.

        Parameters
        ----------
        age : array_like of int
            Units of position since the stream's first observation, at least 0, any shape.
        gap : int
            Gap to the next observation, at least 1.

        Returns
        -------
        ndarray
            Probabilities, same shape as `age`.

        Raises
        ------
        UnusableParameter
            If an age is negative or the gap is below 1.

        Examples
        --------
        >>> GapPrior(shape=2, mean=20.0).first_shift_within([0], 1).tolist()
        [0.05]
        """
        ages = np.asarray(age, dtype=np.int64)
        needed = first_successes_needed(self.shape, self.p, ages)
        return _as_chance(needed @ chance_within(self.shape, self.p, gap))

    def log_survival(self, t: ArrayLike) -> FloatArray:
        """Logarithm of S(t) = P(G > t) for an ordinary run.

        Parameters
        ----------
        t : array_like of int
            Lengths, at least 0, any shape.

        Returns
        -------
        ndarray
            Natural logarithms, same shape; 0 below `shape`, minus infinity where no run can be that long.

        Examples
        --------
        >>> GapPrior(shape=1, mean=50.0).log_survival([0, 100]).round(6).tolist()
        [0.0, -2.020271]
        """
        lengths = np.asarray(t, dtype=np.int64)
        if self.p == 1.0:
            return np.where(lengths < self.shape, 0.0, -math.inf)
        log_terms = log_successes(self.shape, self.p, lengths)
        direct = log_sum(log_terms[..., : self.shape])
        ended = np.exp(log_terms[..., self.shape :]).sum(axis=-1)
        near = 0.0 + np.log1p(-np.minimum(ended, 0.75))
        return np.where(direct > -math.log(2.0), near, direct)

    def mean_residual(self, age: ArrayLike) -> FloatArray:
        """Mean of what is left of an ordinary run, E[G - a | G > a].

        Parameters
        ----------
        age : array_like of int
            Ages a of runs in units of position, at least 0, any shape.

        Returns
        -------
        ndarray
            Units of position, same shape; `mean` at age 0.

        Examples
        --------
        >>> GapPrior(shape=2, mean=20.0).mean_residual([0, 1000]).round(1).tolist()
        [20.0, 10.1]
        """
        ages = np.asarray(age, dtype=np.int64)
        needed: FloatArray = successes_needed(self.shape, self.p, ages) @ _mean_trials(self)
        return needed

    def first_mean_residual(self, age: ArrayLike) -> FloatArray:
        """Mean of what is left of the first run, E[R - a | R > a].

        Parameters
        ----------
        age : array_like of int
            Units of position since the stream's first observation, at least 0, any shape.

        Returns
        -------
        ndarray
            Units of position, same shape; (E[G^2] + E[G]) / (2 E[G]) at age 0.

        Examples
        --------
        >>> GapPrior(shape=2, mean=20.0).first_mean_residual([0]).tolist()
        [15.0]
        """
        ages = np.asarray(age, dtype=np.int64)
        needed: FloatArray = first_successes_needed(self.shape, self.p, ages) @ _mean_trials(self)
        return needed


def _mean_trials(prior: GapPrior) -> FloatArray:
    """Mean trials until the successes still needed, for 1 .. shape of them."""
    return np.arange(1, prior.shape + 1) / prior.p


def _as_chance(values: ArrayLike) -> FloatArray:
    """Shares add up to 1 within rounding only; a chance above 1 would leave a run a negative weight."""
    return np.minimum(np.asarray(values, dtype=np.float64), 1.0)
