"""From a running total, read now and then, to a count for each interval."""

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass

from detectors.errors import UnusableObservation, UnusableParameter

LONGEST_SPAN = 3.0
"""Readings further apart than this many intervals tell no count: it would hide a shift in between."""
LEAST_COVERED = 0.5
"""An interval of which less than this share is covered by readings has no count."""


MOST_INTERVALS = 1_000_000
"""Most intervals from the first count to the last."""


@dataclass(frozen=True, slots=True)
class TotalReading:
    """A running total as it was read.

    Attributes
    ----------
    at : float
        When, on the stream's axis: the number of the interval and the share of it that had gone by.
    total : int
        The total, at least 0.

    Raises
    ------
    UnusableObservation
        If one of them cannot be.
    """

    at: float
    total: int

    def __post_init__(self) -> None:
        if not math.isfinite(self.at):
            raise UnusableObservation("at", self.at, "a finite place on the axis")
        if self.total < 0:
            raise UnusableObservation("total", self.total, "at least 0")


@dataclass(frozen=True, slots=True)
class Increment:
    """What was counted in one interval.

    Attributes
    ----------
    position : int
        The interval's number.
    count : int or None
        Sum of the rises of the total in it; None when it is missing.
    exposure : float
        Intervals' worth of time in which these rises were seen: near 1, less in an interval that is covered
        in part, up to the longest span in one that stands for its neighbours too; 0 when missing.
    covers_from, covers_to : float
        First and last place on the axis that the count covers, for weighing a recurring pattern.
    """

    position: int
    count: int | None
    exposure: float
    covers_from: float
    covers_to: float


@dataclass(frozen=True, slots=True)
class FallenTotal:
    """The total fell: the source restated it.

    Attributes
    ----------
    position : int
        The interval in which the lower total was read.
    at_before, at_after : float
        Places of the two readings.
    before, after : int
        What they read.
    """

    position: int
    at_before: float
    at_after: float
    before: int
    after: int

    @property
    def size(self) -> int:
        """By how much it fell, above 0."""
        return self.before - self.after


@dataclass(frozen=True, slots=True)
class Unplaced:
    """A rise that belongs to no interval: its readings lie too far apart, or cover too little of one.

    Attributes
    ----------
    at_before, at_after : float
        Where it began and ended.
    count : int
        By how much the total rose.
    """

    at_before: float
    at_after: float
    count: int


@dataclass(frozen=True, slots=True)
class Increments:
    """A running total taken apart. Counts and unplaced rises, less the falls, make the whole change.

    Attributes
    ----------
    counts : tuple of Increment
        One an interval, without a hole from the first interval told to the last.
    fallen : tuple of FallenTotal
        Every fall, in order.
    unplaced : tuple of Unplaced
        Every rise that no count holds, in order.
    """

    counts: tuple[Increment, ...]
    fallen: tuple[FallenTotal, ...]
    unplaced: tuple[Unplaced, ...]


@dataclass(frozen=True, slots=True)
class _Rise:
    start: float
    end: float
    count: int

    @property
    def position(self) -> int:
        return math.floor((self.start + self.end) / 2.0)

    @property
    def span(self) -> float:
        return self.end - self.start


def increments(
    readings: Sequence[TotalReading],
    *,
    longest_span: float = LONGEST_SPAN,
    least_covered: float = LEAST_COVERED,
) -> Increments:
    """Take a running total apart into counts of intervals.

    Parameters
    ----------
    readings : sequence of TotalReading
        In ascending order of place; any number an interval.
    longest_span : float
        Longest time between two readings, in intervals, whose rise is told as a count; above 0.
    least_covered : float
        Least exposure of a count, from 0 to 1.

    Returns
    -------
    Increments
        Fewer than two readings tell nothing.

    Raises
    ------
    UnusableObservation
        If the readings do not ascend, or reach over more than `MOST_INTERVALS` intervals.
    UnusableParameter
        If a parameter cannot be.

    Notes
    -----
    A rise belongs to the interval in which the middle of its time lies, with its time as exposure: nothing is
    interpolated, so counts stay whole numbers. Where readings span several intervals the one in the middle
    gets the rise with the exposure of all, its neighbours are missing. (The negative binomial of such a sum
    then has a variance that is too large, which is the safe side.) A fall is listed, and the time between
    its two readings tells no count; what the interval's other readings tell stands. After a fall counting
    goes on from the lower total. A total restated upwards cannot be told from a rise.

    Examples
    --------
    >>> read = [(0.0, 100), (1.0, 130), (2.0, 120), (3.0, 155), (5.0, 215)]
    >>> told = increments([TotalReading(at, total) for at, total in read])
    >>> [(day.position, day.count, day.exposure) for day in told.counts]
    [(0, 30, 1.0), (1, None, 0.0), (2, 35, 1.0), (3, None, 0.0), (4, 60, 2.0)]
    >>> told.fallen[0].size
    10
    """
    _check(readings, longest_span, least_covered)
    rises, fallen, unplaced = _steps(readings, longest_span)
    told = {}
    for position, group in itertools.groupby(rises, key=lambda rise: rise.position):
        within = list(group)
        if sum(rise.span for rise in within) < least_covered:
            unplaced += within
        else:
            told[position] = _sum(position, within)
    unplaced.sort(key=lambda rise: rise.start)
    return Increments(
        counts=_without_holes(told),
        fallen=tuple(fallen),
        unplaced=tuple(Unplaced(rise.start, rise.end, rise.count) for rise in unplaced),
    )


def _check(readings: Sequence[TotalReading], longest_span: float, least_covered: float) -> None:
    for before, after in itertools.pairwise(readings):
        if not after.at > before.at:
            raise UnusableObservation("at", after.at, f"after the reading before it, at {before.at}")
    if not 0.0 < longest_span < math.inf:
        raise UnusableParameter("longest_span", longest_span, "a finite number of intervals above 0")
    if not 0.0 <= least_covered <= 1.0:
        raise UnusableParameter("least_covered", least_covered, "from 0 to 1")


def _steps(
    readings: Sequence[TotalReading], longest_span: float
) -> tuple[list[_Rise], list[FallenTotal], list[_Rise]]:
    """Rises that can be placed, falls, and rises over too long a time."""
    rises: list[_Rise] = []
    fallen: list[FallenTotal] = []
    too_long: list[_Rise] = []
    for before, after in itertools.pairwise(readings):
        if after.total < before.total:
            position = math.floor(after.at)
            fallen.append(FallenTotal(position, before.at, after.at, before.total, after.total))
            continue
        rise = _Rise(before.at, after.at, after.total - before.total)
        (rises if rise.span <= longest_span else too_long).append(rise)
    return rises, fallen, too_long


def _sum(position: int, rises: Sequence[_Rise]) -> Increment:
    return Increment(
        position=position,
        count=sum(rise.count for rise in rises),
        exposure=sum(rise.span for rise in rises),
        covers_from=rises[0].start,
        covers_to=rises[-1].end,
    )


def _without_holes(told: dict[int, Increment]) -> tuple[Increment, ...]:
    if not told:
        return ()
    if max(told) - min(told) >= MOST_INTERVALS:
        raise UnusableObservation("at", max(told), f"within {MOST_INTERVALS} intervals of the first count")
    return tuple(
        told.get(position, Increment(position, None, 0.0, float(position), position + 1.0))
        for position in range(min(told), max(told) + 1)
    )
