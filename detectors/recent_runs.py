"""What the youngest runs would weigh at levels that the grids did not span when those runs began.

A run that has just begun may have a level far from its first counts: they were one-offs. Such levels carry too
little weight to keep nodes for, until a later count makes them likely. Then the grids reach out, and the new
nodes are filled with what the youngest runs would have there: the jump prior from the level that they left,
times the probability of every count since. Older runs have seen too many counts to matter there.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from detectors.bench import Bench
from detectors.jump_prior import IndependentLevels
from detectors.observation import Observation
from detectors.run_slots import RunSlots

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

REMEMBERED = 8


@dataclass(frozen=True)
class RecentRun:
    """A run that began lately.

    Attributes
    ----------
    number : int
        Number of its first count.
    counts : tuple of Observation
        That count, of each stream.
    origin : ndarray, shape (pairs,)
        Mean log level of the weight that shifted then.
    log_scale : ndarray, shape (pairs,)
        Log of that weight, less the logs of all divisors since.
    """

    number: int
    counts: tuple[Observation, ...]
    origin: FloatArray
    log_scale: FloatArray


Recent = tuple[RecentRun, ...]


def remembered(
    recent: Recent, bench: Bench, shifting: FloatArray, counts: tuple[Observation, ...], number: int
) -> Recent:
    """The youngest runs after one more has begun, before the divisors of its count are noted.

    Parameters
    ----------
    recent : tuple of RecentRun
        Those before, oldest first.
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
    tuple of RecentRun
    """
    if isinstance(bench.model.jump, IndependentLevels):
        return ()
    grid = bench.grid
    total = np.maximum(np.add.reduceat(shifting, grid.start), 1e-300)
    origin = np.add.reduceat(shifting * grid.log_level, grid.start) / total
    return (*recent, RecentRun(number, counts, origin, np.log(total)))[-REMEMBERED:]


def divided(recent: Recent, log_divisor: FloatArray) -> Recent:
    """The runs after all weights were divided by a number a pair, shape (pairs,)."""
    return tuple(replace(run, log_scale=run.log_scale - log_divisor) for run in recent)


def of_pairs(recent: Recent, kept: IntArray) -> Recent:
    """The runs with some of the pairs only."""
    return tuple(replace(run, origin=run.origin[kept], log_scale=run.log_scale[kept]) for run in recent)


def fill(
    weights: NDArray[np.floating],
    rows: IntArray,
    bench: Bench,
    recent: Recent,
    slots: RunSlots,
    run_factor: FloatArray,
) -> None:
    """Fill new nodes with the weights of the youngest runs, in place.

    Parameters
    ----------
    weights : ndarray, shape (rows of the grids, slots)
        The weights; changed in the given rows.
    rows : ndarray of int, shape (n,)
        Rows of the new nodes.
    bench : Bench
        The grids that hold them.
    recent : tuple of RecentRun
        The youngest runs, oldest first.
    slots : RunSlots
        Where each run stands.
    run_factor : ndarray, shape (slots,)
        Factor of each run's column.

    Notes
    -----
    The wander since the run began is left out; the run is too young for it to matter at a distance.
    """
    jump = bench.model.jump
    if isinstance(jump, IndependentLevels) or not recent or not rows.size:
        return
    grid = bench.grid
    pair, level = grid.pair[rows], grid.log_level[rows]
    log_since = np.zeros(rows.size)
    for run in reversed(recent):
        log_since += bench.log_likelihood_at(rows, run.counts)
        place = np.flatnonzero((slots.newest == run.number) & (slots.oldest == run.number))
        if place.size != 1 or run_factor[place[0]] <= 0.0:
            continue
        prior = jump.density(level - run.origin[pair]) * grid.spacing[pair]
        filled = prior * np.exp(np.minimum(log_since + run.log_scale[pair], 600.0))
        weights[rows, place[0]] = filled / run_factor[place[0]]


def joined_recent(parts: Sequence[Recent]) -> Recent:
    """The youngest runs of streams that are put side by side."""
    return tuple(
        RecentRun(
            number=runs[0].number,
            counts=tuple(count for run in runs for count in run.counts),
            origin=np.concatenate([run.origin for run in runs]),
            log_scale=np.concatenate([run.log_scale for run in runs]),
        )
        for runs in zip(*parts, strict=True)
    )
