"""Seeded count series with a known truth, for measuring what the detector sees."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from detectors.errors import UnusableParameter
from detectors.observation import Observation

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class OneOffs:
    """How often a count is a one-off, and by which factors (log-uniform between the two).

    Attributes
    ----------
    share : float
        Probability that a count is one, at least 0 and below 1.
    least, most : float
        Smallest and largest factor, above 0.
    """

    share: float = 0.0
    least: float = 5.0
    most: float = 50.0

    def __post_init__(self) -> None:
        if not 0.0 <= self.share < 1.0:
            raise UnusableParameter("share", self.share, "at least 0 and below 1")
        if not 0.0 < self.least <= self.most < math.inf:
            raise UnusableParameter(
                "most", self.most, f"finite and at least the smallest factor, {self.least}"
            )


NO_ONE_OFFS = OneOffs()


def simulate(
    levels: FloatArray, dispersion: float, one_offs: OneOffs, random: np.random.Generator
) -> IntArray:
    """Counts around a path of levels.

    Parameters
    ----------
    levels : ndarray, shape (n,)
        Level at each place, above 0.
    dispersion : float
        Dispersion of the negative binomial; infinity is the Poisson limit.
    one_offs : OneOffs
        How one-offs multiply counts.
    random : numpy.random.Generator
        Source of randomness; the same state gives the same counts.

    Returns
    -------
    ndarray of int, shape (n,)

    Examples
    --------
    >>> simulate(np.full(3, 10.0), 5.0, NO_ONE_OFFS, np.random.default_rng(1)).tolist()
    [15, 11, 17]
    """
    size = levels.shape
    spread = np.ones(size) if math.isinf(dispersion) else random.gamma(dispersion, 1.0 / dispersion, size)
    counts = random.poisson(levels * spread)
    odd = random.random(size) < one_offs.share
    factor = np.exp(random.uniform(math.log(one_offs.least), math.log(one_offs.most), size))
    return np.where(odd, np.floor(counts * factor), counts).astype(np.int64)


def stepped(level: float, size: int, *, change_at: int, factor: float) -> FloatArray:
    """A level that is multiplied by a factor from one place on, shape (size,)."""
    levels = np.full(size, float(level))
    levels[change_at:] *= factor
    return levels


def wearing(level: float, size: int, *, share_a_year: float, counts_a_year: int = 52) -> FloatArray:
    """A level that wears down by a share a year, a little with every count, shape (size,)."""
    return level * (1.0 - share_a_year) ** (np.arange(size) / counts_a_year)


def as_observations(counts: IntArray) -> list[Observation]:
    """Counts at neighbouring positions, from 0 on."""
    return [Observation(place, count) for place, count in enumerate(counts.tolist())]
