"""The classic single change-point analysis: one change or none, every date equally likely beforehand."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from detectors.errors import UnusableObservation, UnusableParameter
from detectors.judge import region
from detectors.single_change_laws import CountLaw

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

DATE_SHARE = 0.95


@dataclass(frozen=True, slots=True)
class LevelMoments:
    """Posterior mean and standard deviation of a level; the deviation is infinite where there is none."""

    mean: float
    sd: float


@dataclass(frozen=True, slots=True)
class SingleChange:
    """What is said of exactly one change, and how it compares with none.

    Attributes
    ----------
    probability : tuple of float
        Posterior probability that the first regime ends with the k-th count, k = 1 .. n - 1, given that there
        is exactly one change. They sum to 1.
    mode : int
        The most probable number k of counts in the first regime; of equally probable ones the larger.
    mean : float
        Posterior mean of k.
    quantiles : tuple of int
        The 2.5 %, 50 % and 97.5 % quantiles of k.
    dates : tuple of int
        Smallest set of k that holds at least the share asked for, ascending. It need not be an interval.
        Values are taken in order of falling probability, of equal ones the larger first.
    dates_probability : float
        What the set holds.
    level_before, level_after : LevelMoments
        Of the two levels, all dates weighed by their probability.
    log_evidence_none, log_evidence_one : float
        Log probability of the counts without a change, and with exactly one.
    """

    probability: tuple[float, ...]
    mode: int
    mean: float
    quantiles: tuple[int, int, int]
    dates: tuple[int, ...]
    dates_probability: float
    level_before: LevelMoments
    level_after: LevelMoments
    log_evidence_none: float
    log_evidence_one: float

    @property
    def log_bayes_factor(self) -> float:
        """Log of how much more probable the counts are with one change than with none."""
        return self.log_evidence_one - self.log_evidence_none


def single_change(counts: Sequence[int], law: CountLaw, *, share: float = DATE_SHARE) -> SingleChange:
    """Analyse a record for exactly one change.

    Parameters
    ----------
    counts : sequence of int
        At least two counts, none missing.
    law : CountLaw
        Law of the counts of a regime, with its level's prior; both regimes have their own level.
        `PoissonGamma` and `BetaNegativeBinomial` of `detectors.single_change_laws` are closed forms;
        those of `detectors.single_change_quadrature` integrate numerically.
    share : float
        Share that the set of dates is to hold, above 0 and at most 1.

    Returns
    -------
    SingleChange

    Raises
    ------
    UnusableParameter, UnusableObservation
        If there are fewer than two counts, one of them is negative, or the share is outside its range.

    Notes
    -----
    P(k | counts) is proportional to m(1, k) m(k + 1, n), with m the probability of the counts of a segment,
    its level integrated out; the evidence of one change is the mean of these products over k.

    References
    ----------
    Carlin, Gelfand & Smith (1992), Hierarchical Bayesian analysis of changepoint problems, Applied Statistics
    41, 389-405. Box & Tiao (1973) for highest-posterior sets.

    Examples
    --------
    >>> from detectors.single_change_laws import PoissonGamma
    >>> said = single_change([9, 11, 8, 10, 3, 2, 4, 3], PoissonGamma(1.0, 0.1))
    >>> said.mode, said.dates, round(said.log_bayes_factor, 3)
    (4, (3, 4, 5), 3.675)
    """
    _require_usable(counts, share)
    table = law.segments(np.asarray(counts, dtype=np.float64))
    log_joint = table.log_before + table.log_after
    log_one = _log_mean(log_joint)
    probability = np.exp(log_joint - log_joint.max())
    probability /= probability.sum()
    date = np.arange(1, len(counts))
    dates = region(date, probability, share)
    return SingleChange(
        probability=tuple(probability.tolist()),
        mode=int(date[np.lexsort((-date, -probability))[0]]),
        mean=float(probability @ date),
        quantiles=_quantiles(probability),
        dates=dates,
        dates_probability=float(probability[np.array(dates) - 1].sum()),
        level_before=_moments(probability, table.mean_before, table.square_before),
        level_after=_moments(probability, table.mean_after, table.square_after),
        log_evidence_none=table.log_whole,
        log_evidence_one=log_one,
    )


def log_comparison(one: SingleChange, other: SingleChange) -> float:
    """Log of how much better one law of the counts explains a record than another.

    Parameters
    ----------
    one, other : SingleChange
        Analyses of the same counts under two laws.

    Returns
    -------
    float
        Difference of the log evidence, no change and one change being equally likely beforehand.
    """
    return float(
        np.logaddexp(one.log_evidence_none, one.log_evidence_one)
        - np.logaddexp(other.log_evidence_none, other.log_evidence_one)
    )


def _require_usable(counts: Sequence[int], share: float) -> None:
    if len(counts) < 2:
        raise UnusableParameter("counts", len(counts), "at least two counts")
    if min(counts) < 0:
        raise UnusableObservation("count", min(counts), "an integer of at least 0")
    if not 0.0 < share <= 1.0:
        raise UnusableParameter("share", share, "above 0 and at most 1")


def _log_mean(logs: FloatArray) -> float:
    top = float(logs.max())
    return top + math.log(float(np.exp(logs - top).mean()))


def _quantiles(probability: FloatArray) -> tuple[int, int, int]:
    running = np.cumsum(probability)
    low, mid, high = (int(np.searchsorted(running, share * running[-1])) + 1 for share in (0.025, 0.5, 0.975))
    return low, mid, high


def _moments(probability: FloatArray, mean: FloatArray, square: FloatArray) -> LevelMoments:
    """Mean and standard deviation of a mixture, from each part's mean and mean square."""
    whole = float(probability @ mean)
    variance = float(probability @ square) - whole**2
    return LevelMoments(whole, math.sqrt(variance) if variance > 0.0 else 0.0)
