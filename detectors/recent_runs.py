"""What the youngest runs would weigh at levels that the grids did not span when those runs began.

A run that has just begun may have a level far from its first counts: they were one-offs. Such levels carry
too little weight to keep nodes for, until a later count makes them likely. Then the grids reach out, and the
new nodes are filled with what the youngest runs would have there: the jump prior from the level that they
left, times the probability of every count since. Older runs have seen too many counts to matter there.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from detectors.bench import Bench
from detectors.jump_prior import IndependentLevels
from detectors.observation import Observation
from detectors.run_slots import RunSlots

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

REMEMBERED = 8
MOST_FILLED = 0.05
LARGEST_LOG = 600.0


@dataclass(frozen=True)
class RecentRuns:
    """The runs that began last, oldest first.

    Attributes
    ----------
    numbers : tuple of int
        Number of each run's first count.
    counts : tuple of tuple of Observation
        That count, of each stream.
    origin : ndarray, shape (runs, pairs)
        Mean log level of the weight that shifted then.
    log_scale : ndarray, shape (runs, pairs)
        Log of that weight, less the logs of all divisors since.
    """

    numbers: tuple[int, ...]
    counts: tuple[tuple[Observation, ...], ...]
    origin: FloatArray
    log_scale: FloatArray

    def divided(self, log_divisor: FloatArray) -> "RecentRuns":
        """After all weights were divided by a number a pair, shape (pairs,)."""
        return RecentRuns(self.numbers, self.counts, self.origin, self.log_scale - log_divisor)

    def forgotten(self, pairs: NDArray[np.bool_]) -> "RecentRuns":
        """With nothing to fill in for some of the pairs."""
        return RecentRuns(self.numbers, self.counts, self.origin, np.where(pairs, -np.inf, self.log_scale))

    def of_pairs(self, kept: IntArray) -> "RecentRuns":
        """With some of the pairs only."""
        return RecentRuns(self.numbers, self.counts, self.origin[:, kept], self.log_scale[:, kept])


def none_recent(pairs: int) -> RecentRuns:
    """No run began lately."""
    return RecentRuns((), (), np.empty((0, pairs)), np.empty((0, pairs)))


def remembered(
    recent: RecentRuns, bench: Bench, shifting: FloatArray, counts: tuple[Observation, ...], number: int
) -> RecentRuns:
    """The youngest runs after one more has begun, before the divisors of its count are noted.

    Parameters
    ----------
    recent : RecentRuns
        Those before.
    bench : Bench
        The grids.
    shifting : ndarray, shape (rows,)
        The weight that shifts now.
    counts : tuple of Observation
        The new run's first count, of each stream.
    number : int
        Its number.

    Returns
    -------
    RecentRuns
    """
    if isinstance(bench.model.jump, IndependentLevels):
        return recent
    grid = bench.grid
    total = np.maximum(np.add.reduceat(shifting, grid.start), 1e-300)
    origin = np.add.reduceat(shifting * grid.log_level, grid.start) / total
    return RecentRuns(
        (*recent.numbers, number)[-REMEMBERED:],
        (*recent.counts, counts)[-REMEMBERED:],
        np.concatenate((recent.origin, origin[None, :]))[-REMEMBERED:],
        np.concatenate((recent.log_scale, np.log(total)[None, :]))[-REMEMBERED:],
    )


def fill(
    weights: NDArray[np.floating],
    rows: IntArray,
    bench: Bench,
    recent: RecentRuns,
    slots: RunSlots,
    run_factor: FloatArray,
    pair_total: FloatArray,
) -> FloatArray:
    """Fill new nodes with the weights of the youngest runs, in place.

    Parameters
    ----------
    weights : ndarray, shape (rows of the grids, slots)
        The weights; changed in the given rows.
    rows : ndarray of int, shape (n,)
        Rows of the new nodes.
    bench : Bench
        The grids that hold them.
    recent : RecentRuns
        The youngest runs.
    slots : RunSlots
        Where each run stands.
    run_factor : ndarray, shape (slots,)
        Factor of each run's column.
    pair_total : ndarray, shape (pairs,)
        Total of each pair's weights. What is filled in may be a `MOST_FILLED` part of it at most: the grids
        were laid so that less was left out, and more would be an error of this approximation.

    Returns
    -------
    ndarray, shape (pairs,)
        Total of what was filled in.

    Notes
    -----
    The wander since the run began is left out; the run is too young for it to matter at a distance.
    """
    jump = bench.model.jump
    none = np.zeros(pair_total.size)
    if isinstance(jump, IndependentLevels) or not recent.numbers or not rows.size:
        return none
    grid = bench.grid
    pair, level = grid.pair[rows], grid.log_level[rows]
    log_since = np.zeros(rows.size)
    columns: list[int] = []
    filled: list[FloatArray] = []
    for index in reversed(range(len(recent.numbers))):
        number = recent.numbers[index]
        log_since += bench.log_likelihood_at(rows, recent.counts[index])
        place = np.flatnonzero((slots.newest == number) & (slots.oldest == number))
        if place.size != 1 or run_factor[place[0]] <= 0.0:
            continue
        prior = jump.density(level - recent.origin[index, pair]) * grid.spacing[pair]
        columns.append(int(place[0]))
        filled.append(prior * np.exp(np.minimum(log_since + recent.log_scale[index, pair], LARGEST_LOG)))
    if not columns:
        return none
    values = np.stack(filled, axis=1) * run_factor[columns]
    total = np.bincount(pair, weights=values.sum(axis=1), minlength=pair_total.size)
    bound = np.minimum(1.0, MOST_FILLED * pair_total / np.maximum(total, 1e-300))
    weights[np.ix_(rows, np.array(columns))] = values * bound[pair, None] / run_factor[columns]
    return np.asarray(total * bound)


def joined_recent(parts: Sequence[RecentRuns]) -> RecentRuns:
    """The youngest runs of streams that are put side by side."""
    return RecentRuns(
        parts[0].numbers,
        tuple(
            tuple(one for count in counts for one in count)
            for counts in zip(*(p.counts for p in parts), strict=True)
        ),
        np.concatenate([part.origin for part in parts], axis=1),
        np.concatenate([part.log_scale for part in parts], axis=1),
    )
