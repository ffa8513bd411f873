"""From readings of growing counts to a triangle: what each release had reached at stated ages."""

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import PchipInterpolator

from detectors.errors import UnusableObservation, UnusableParameter

FloatArray = NDArray[np.float64]

WIDEST_GAP = 1.0
"""Two readings lie too far apart to tell a cell between them if the gap is longer than the cell's age."""
TOLERATED_FALL = 0.01
"""A fall by at most this share is a correction of the same count; a larger one is another way of counting."""


@dataclass(frozen=True, slots=True)
class Growth:
    """The readings of one release's growing total.

    Attributes
    ----------
    ages : tuple of float
        Age at each reading in days, at least 0, ascending.
    counts : tuple of int
        The total read at each age, at least 0. It may fall: the source restated it.

    Raises
    ------
    UnusableObservation
        If the ages do not ascend, or a count or age is none.
    """

    ages: tuple[float, ...]
    counts: tuple[int, ...]

    def __post_init__(self) -> None:
        if len(self.ages) != len(self.counts):
            raise UnusableObservation("ages", len(self.ages), f"as many as counts, {len(self.counts)}")
        before = -math.inf
        for age in self.ages:
            if not (0.0 <= age < math.inf and age > before):
                raise UnusableObservation("age", age, "finite, at least 0 and above the one before it")
            before = age
        for count in self.counts:
            if count < 0:
                raise UnusableObservation("count", count, "at least 0")


@dataclass(frozen=True, slots=True)
class Restated:
    """A release's total fell from one reading to the next.

    Attributes
    ----------
    row : int
        The release's row in the triangle.
    age_before, age_after : float
        Ages of the two readings, in days.
    count_before, count_after : int
        What they read.
    """

    row: int
    age_before: float
    age_after: float
    count_before: int
    count_after: int

    @property
    def share(self) -> float:
        """The fall as a share of the total before it."""
        return 1.0 - self.count_after / self.count_before


@dataclass(frozen=True, eq=False)
class Triangle:
    """Totals of releases (rows, in order of release) at stated ages (columns).

    Attributes
    ----------
    ages : tuple of float
        The stated ages in days, ascending; the last is the age at which counts are compared.
    counts : ndarray, shape (rows, ages)
        What each release had reached; NaN where that is not known.
    restated : tuple of Restated
        Every fall of a total, small ones included, in order of row and age.
    """

    ages: tuple[float, ...]
    counts: FloatArray
    restated: tuple[Restated, ...] = ()

    def __post_init__(self) -> None:
        checked_ages(self.ages)
        if self.counts.ndim != 2 or self.counts.shape[1] != len(self.ages):
            raise UnusableParameter("counts", self.counts.shape, f"of shape (rows, {len(self.ages)})")
        if np.isinf(self.counts).any() or (self.counts < 0.0).any():
            raise UnusableParameter("counts", "an infinite or negative cell", "at least 0, or NaN if unknown")

    def newest(self, rows: int) -> "Triangle":
        """The triangle of the newest rows alone, so that factors follow a habit that changes."""
        first = max(len(self.counts) - rows, 0)
        kept = tuple(
            Restated(fall.row - first, fall.age_before, fall.age_after, fall.count_before, fall.count_after)
            for fall in self.restated
            if fall.row >= first
        )
        return Triangle(self.ages, self.counts[first:], kept)


def build_triangle(
    growths: Sequence[Growth],
    ages: Sequence[float],
    *,
    widest_gap: float = WIDEST_GAP,
    tolerated_fall: float = TOLERATED_FALL,
) -> Triangle:
    """Read off what each release had reached at stated ages.

    Parameters
    ----------
    growths : sequence of Growth
        The readings, one entry a release, in order of release.
    ages : sequence of float
        The stated ages in days, above 0, ascending; the last is the age at which counts are compared.
    widest_gap : float
        A cell between two readings is told only if they lie at most this many times the cell's age apart.
    tolerated_fall : float
        A fall by more than this share starts another way of counting: cells before it are unknown.

    Returns
    -------
    Triangle
        Cells before a release's first reading (releases older than the first poll) and after its last one
        are unknown. Between readings the cell is interpolated monotonically; at a reading it is the count.

    Raises
    ------
    UnusableParameter
        If the ages do not ascend from above 0.

    References
    ----------
    Fritsch & Carlson (1980), Monotone piecewise cubic interpolation, SIAM J. Numer. Anal. 17, 238-246.

    Examples
    --------
    >>> early = Growth(ages=(0.5, 1.0, 2.0, 4.0), counts=(40, 60, 80, 90))
    >>> young = Growth(ages=(0.5, 1.5), counts=(30, 50))
    >>> build_triangle([early, young], ages=(1.0, 2.0, 4.0)).counts.round(1).tolist()
    [[60.0, 80.0, 90.0], [40.0, nan, nan]]
    """
    stated = np.asarray(checked_ages(tuple(ages)))
    if not widest_gap > 0.0:
        raise UnusableParameter("widest_gap", widest_gap, "above 0")
    if not 0.0 <= tolerated_fall <= 1.0:
        raise UnusableParameter("tolerated_fall", tolerated_fall, "from 0 to 1")
    counts = np.full((len(growths), stated.size), np.nan)
    restated: list[Restated] = []
    for row, growth in enumerate(growths):
        falls = _falls(row, growth)
        restated.extend(falls)
        counts[row] = _cells(_one_counting(growth, falls, tolerated_fall), stated, widest_gap)
    return Triangle(tuple(stated.tolist()), counts, tuple(restated))


def checked_ages(ages: tuple[float, ...]) -> tuple[float, ...]:
    """The stated ages, if they can be: above 0, finite, ascending.

    Raises
    ------
    UnusableParameter
        If not.
    """
    ascending = all(before < after for before, after in itertools.pairwise(ages))
    if not ages or not ascending or not 0.0 < ages[0] <= ages[-1] < math.inf:
        raise UnusableParameter("ages", ages, "one or more days above 0, ascending")
    return ages


def _falls(row: int, growth: Growth) -> list[Restated]:
    steps = zip(growth.ages, growth.ages[1:], growth.counts, growth.counts[1:], strict=False)
    return [Restated(row, *step) for step in steps if step[3] < step[2]]


def _one_counting(growth: Growth, falls: Sequence[Restated], tolerated_fall: float) -> Growth:
    """The readings from the last larger fall on: those before it were counted in another way."""
    large = [fall.age_after for fall in falls if fall.share > tolerated_fall]
    first = growth.ages.index(large[-1]) if large else 0
    return Growth(growth.ages[first:], growth.counts[first:])


def _cells(growth: Growth, stated: FloatArray, widest_gap: float) -> FloatArray:
    cells = np.full(stated.size, np.nan)
    if not growth.ages:
        return cells
    ages = np.asarray(growth.ages)
    after = np.searchsorted(ages, stated)
    inside = (stated >= ages[0]) & (stated <= ages[-1])
    at_reading = inside & (ages[np.minimum(after, ages.size - 1)] == stated)
    gap = np.diff(ages, prepend=-np.inf, append=np.inf)[after]
    told = at_reading | (inside & (gap <= widest_gap * stated))
    if ages.size > 1:
        between = told & ~at_reading
        cells[between] = PchipInterpolator(ages, np.asarray(growth.counts, dtype=np.float64))(stated[between])
    cells[at_reading] = np.asarray(growth.counts, dtype=np.float64)[after[at_reading]]
    return cells
