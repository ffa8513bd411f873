"""Laws of the counts of one regime, its level integrated out: what a single change-point analysis needs."""

import math
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray
from scipy.special import betaln, gammaln

from detectors.errors import UnusableParameter

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class SegmentTable:
    """Log probability of the counts on both sides of each cut, and what they say of the level.

    Attributes
    ----------
    log_before, log_after : ndarray, shape (n - 1,)
        Log probability of the first k counts and of the rest, k = 1 .. n - 1.
    mean_before, mean_after : ndarray, shape (n - 1,)
        Posterior mean of their level.
    square_before, square_after : ndarray, shape (n - 1,)
        Posterior mean of its square; infinite where there is none.
    log_whole : float
        Log probability of all counts at one level.
    """

    log_before: FloatArray
    log_after: FloatArray
    mean_before: FloatArray
    mean_after: FloatArray
    square_before: FloatArray
    square_after: FloatArray
    log_whole: float


class CountLaw(Protocol):
    """The law of the counts of a regime."""

    def segments(self, counts: FloatArray) -> SegmentTable:
        """Tabulate both sides of each cut of a record, shape (n,)."""


@dataclass(frozen=True, slots=True)
class PoissonGamma:
    """Poisson counts; the level is gamma distributed beforehand.

    Attributes
    ----------
    shape, rate : float
        Of the gamma distribution, both above 0.

    Examples
    --------
    >>> table = PoissonGamma(1.0, 1.0).segments(np.array([4.0, 5.0, 4.0]))
    >>> np.exp(table.log_before).round(8).tolist()
    [0.03125, 0.00213382]
    """

    shape: float = 1.0
    rate: float = 1.0

    def __post_init__(self) -> None:
        require_positive(shape=self.shape, rate=self.rate)

    def log_marginal(self, total: FloatArray, size: FloatArray) -> FloatArray:
        """Log probability of so many counts with a sum, without the factorials."""
        a, b = self.shape, self.rate
        return np.asarray(
            a * math.log(b) - math.lgamma(a) + gammaln(a + total) - (a + total) * np.log(b + size)
        )

    def log_density(self, level: FloatArray) -> FloatArray:
        """Log prior density of the level."""
        a, b = self.shape, self.rate
        return np.asarray(a * math.log(b) - math.lgamma(a) + (a - 1.0) * np.log(level) - b * level)

    def segments(self, counts: FloatArray) -> SegmentTable:
        """Tabulate both sides of each cut of a record, shape (n,)."""
        log_factorial = gammaln(counts + 1.0)

        def moments(total: FloatArray, size: FloatArray) -> tuple[FloatArray, FloatArray]:
            a, b = self.shape + total, self.rate + size
            return a / b, a * (a + 1.0) / b**2

        return _from_sums(counts, -log_factorial, self.log_marginal, moments)


@dataclass(frozen=True, slots=True)
class BetaNegativeBinomial:
    """Negative-binomial counts of a known size r; p = r / (r + level) is beta distributed beforehand.

    Attributes
    ----------
    size : float
        Dispersion r, above 0.
    a, b : float
        Parameters of the beta distribution of p, both above 0.

    References
    ----------
    Johnson, Kemp & Kotz (2005), Univariate Discrete Distributions, section 6.2.3 (beta-negative binomial).

    Examples
    --------
    >>> table = BetaNegativeBinomial(10.0, 4.0, 3.0).segments(np.array([0.0, 50.0]))
    >>> np.exp(table.log_before).round(12).tolist()
    [0.035714285714]
    """

    size: float
    a: float = 1.0
    b: float = 1.0

    def __post_init__(self) -> None:
        require_positive(size=self.size, a=self.a, b=self.b)

    def log_marginal(self, total: FloatArray, size: FloatArray) -> FloatArray:
        """Log probability of so many counts with a sum, without the binomial coefficients."""
        return np.asarray(betaln(self.a + self.size * size, self.b + total) - betaln(self.a, self.b))

    def log_density(self, level: FloatArray) -> FloatArray:
        """Log prior density of the level r (1 - p) / p."""
        share = self.size / (self.size + level)
        log_p = (self.a - 1.0) * np.log(share) + (self.b - 1.0) * np.log(level / (self.size + level))
        return np.asarray(log_p - betaln(self.a, self.b) + np.log(share * share / self.size))

    def segments(self, counts: FloatArray) -> SegmentTable:
        """Tabulate both sides of each cut of a record, shape (n,)."""
        each = gammaln(self.size + counts) - math.lgamma(self.size) - gammaln(counts + 1.0)

        def moments(total: FloatArray, size: FloatArray) -> tuple[FloatArray, FloatArray]:
            a, b, r = self.a + self.size * size, self.b + total, self.size
            mean = np.where(a > 1.0, r * b / np.maximum(a - 1.0, 1e-300), math.inf)
            square = r * r * b * (b + 1.0) / np.maximum((a - 1.0) * (a - 2.0), 1e-300)
            return mean, np.where(a > 2.0, square, math.inf)

        return _from_sums(counts, each, self.log_marginal, moments)


def _from_sums(
    counts: FloatArray, each: FloatArray, log_marginal: "LogMarginal", moments: "Moments"
) -> SegmentTable:
    """Both sides of each cut from running sums; `each` is what every count adds by itself."""
    total, own = np.cumsum(counts), np.cumsum(each)
    size = np.arange(1.0, counts.size + 1.0)
    rest, left = total[-1] - total[:-1], size[-1] - size[:-1]
    mean_before, square_before = moments(total[:-1], size[:-1])
    mean_after, square_after = moments(rest, left)
    return SegmentTable(
        log_before=log_marginal(total[:-1], size[:-1]) + own[:-1],
        log_after=log_marginal(rest, left) + own[-1] - own[:-1],
        mean_before=mean_before,
        mean_after=mean_after,
        square_before=square_before,
        square_after=square_after,
        log_whole=float(log_marginal(total[-1:], size[-1:])[0] + own[-1]),
    )


class LogMarginal(Protocol):
    """Log probability of counts from their sum and number."""

    def __call__(self, total: FloatArray, size: FloatArray) -> FloatArray:
        """Shape of both."""


class Moments(Protocol):
    """Posterior mean and mean square of the level from the sum and the number of counts."""

    def __call__(self, total: FloatArray, size: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Shape of both, twice."""


def require_positive(**values: float) -> None:
    """Refuse parameters that are not finite and above 0.

    Raises
    ------
    UnusableParameter
        For the first such.
    """
    for name, value in values.items():
        if not 0.0 < value < math.inf:
            raise UnusableParameter(name, value, "a finite number above 0")
