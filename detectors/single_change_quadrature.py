"""Laws of the counts of one regime whose level has to be integrated out numerically."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from detectors.counts import log_negative_binomial
from detectors.errors import UnusableParameter
from detectors.one_off import log_one_off, mixture
from detectors.single_change_laws import (
    BetaNegativeBinomial,
    PoissonGamma,
    SegmentTable,
    require_positive,
)

FloatArray = NDArray[np.float64]

FEWEST_NODES = 4001
MOST_CELLS = 8_000_000
"""Most nodes times counts; what would take more is refused."""
PER_SD = 1.2
"""Widest spacing of the log level in standard deviations of its posterior, where it is narrowest."""
FARTHEST = 60.0
LARGEST_LOG = 200.0


@dataclass(frozen=True, slots=True)
class NegativeBinomialGamma:
    """Negative-binomial counts of a known size; the level is gamma distributed beforehand.

    With the same gamma distribution as a Poisson law's, the two can be compared: they differ in how counts
    spread around the level and in nothing else.

    Attributes
    ----------
    size : float
        Dispersion r, above 0.
    shape, rate : float
        Of the gamma distribution, both above 0.

    Examples
    --------
    >>> counts = np.array([4.0, 5.0, 4.0])
    >>> clustered = NegativeBinomialGamma(1e9, 1.0, 1.0).segments(counts).log_before
    >>> np.abs(clustered - PoissonGamma(1.0, 1.0).segments(counts).log_before).max() < 1e-7
    np.True_
    """

    size: float
    shape: float = 1.0
    rate: float = 1.0

    def __post_init__(self) -> None:
        require_positive(size=self.size, shape=self.shape, rate=self.rate)

    def log_density(self, level: FloatArray) -> FloatArray:
        """Log prior density of the level."""
        return PoissonGamma(self.shape, self.rate).log_density(level)

    def segments(self, counts: FloatArray) -> SegmentTable:
        """Tabulate both sides of each cut of a record, shape (n,)."""
        return WithOneOffs(self, share=0.0).segments(counts)


@dataclass(frozen=True, slots=True)
class WithOneOffs:
    """A law of which each count is a one-off with a small probability.

    Attributes
    ----------
    law : PoissonGamma, BetaNegativeBinomial or NegativeBinomialGamma
        The ordinary law and the prior of the level.
    share : float
        Probability of a one-off, at least 0 and below 1.
    tail : float
        Tail exponent of the one-offs' law (see `detectors.one_off`), above 0.

    Raises
    ------
    UnusableParameter
        If a parameter is outside its range; from `segments`, if the counts are so many, so large and so
        little dispersed that the quadrature would take more than `MOST_CELLS` cells.

    Notes
    -----
    The trapezoid rule over t, the log level being centre + reach sinh(t): fine near the counts, far in the
    tails of the prior. Log evidence is within 1e-7 of the closed form where there is one (tests).

    Examples
    --------
    >>> plain, law = PoissonGamma(1.0, 1.0), WithOneOffs(PoissonGamma(1.0, 1.0), share=0.0)
    >>> counts = np.array([4.0, 5.0, 4.0, 1.0])
    >>> np.abs(law.segments(counts).log_before - plain.segments(counts).log_before).max() < 1e-9
    np.True_
    """

    law: PoissonGamma | BetaNegativeBinomial | NegativeBinomialGamma
    share: float = 0.02
    tail: float = 1.0

    def __post_init__(self) -> None:
        if not 0.0 <= self.share < 1.0:
            raise UnusableParameter("share", self.share, "at least 0 and below 1")
        require_positive(tail=self.tail)

    def segments(self, counts: FloatArray) -> SegmentTable:
        """Tabulate both sides of each cut of a record, shape (n,)."""
        level, log_weight = self._nodes(counts)
        running = np.cumsum([self._log_probability(count, level) for count in counts.tolist()], axis=0)
        before = _integrated(running[:-1] + log_weight, level)
        after = _integrated(running[-1] - running[:-1] + log_weight, level)
        whole = _integrated(running[-1:] + log_weight, level)
        return SegmentTable(
            log_before=before[0],
            log_after=after[0],
            mean_before=before[1],
            mean_after=after[1],
            square_before=before[2],
            square_after=after[2],
            log_whole=float(whole[0][0]),
        )

    @property
    def _size(self) -> float:
        return math.inf if isinstance(self.law, PoissonGamma) else self.law.size

    def _log_probability(self, count: float, level: FloatArray) -> FloatArray:
        log_p = log_negative_binomial(count, level, self._size)
        if self.share == 0.0:
            return log_p
        return mixture(log_p, log_one_off(count, level, self.tail), self.share)[0]

    def _nodes(self, counts: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Levels, closer together where the level is in question, and the log weight of each.

        The log level is centre + reach sinh(t), t equally spaced: fine near the counts, far in the tails.
        """
        logs = np.log(counts + 0.5)
        reach = 2.0 + float(np.ptp(logs))
        end = math.asinh(FARTHEST / reach)
        t = np.linspace(-end, end, self._number_of_nodes(counts, reach * end))
        log_level = np.clip((logs.max() + logs.min()) / 2.0 + reach * np.sinh(t), -LARGEST_LOG, LARGEST_LOG)
        level = np.exp(log_level)
        step = reach * np.cosh(t) * (t[1] - t[0])
        return level, self.law.log_density(level) + log_level + np.log(step)

    def _number_of_nodes(self, counts: FloatArray, half_range: float) -> int:
        variance = 1.0 / (counts.max() + 0.5) + 1.0 / self._size
        narrowest = math.sqrt(variance / counts.size)
        needed = 2 * math.ceil(half_range / (PER_SD * narrowest)) + 1
        if needed * counts.size > MOST_CELLS:
            narrowest = 2.0 * half_range * counts.size / (PER_SD * MOST_CELLS)
            most = 1.0 / (counts.size * narrowest**2)
            raise UnusableParameter(
                "size", self._size, f"below {most:.3g} for so many and so large counts with one-offs"
            )
        return max(needed, FEWEST_NODES)


def _integrated(log_weight: FloatArray, level: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Log sum over the nodes, mean and mean square of the level, for each row."""
    top = log_weight.max(axis=1, keepdims=True)
    weight = np.exp(log_weight - top)
    total = weight.sum(axis=1)
    return np.log(total) + top[:, 0], weight @ level / total, weight @ level**2 / total
