"""The model as a Markov chain of the level and the successes that the run still needs.

A negative-binomial run length is a chain of `shape` phases: the run ends when its last success comes. Beside
the level, the phase is all that a run's past says of its future, so nothing has to be kept of run starts: one
step costs the same however long the record is, and no runs are merged.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property, lru_cache

import numpy as np
from numpy.typing import NDArray

from detectors.bench import Bench, Likelihood, bench_for
from detectors.binomial_sums import chance_within, log_successes
from detectors.gap_prior import GapPrior
from detectors.jump_prior import IndependentLevels
from detectors.look_back_grid import record_grid
from detectors.look_back_jump import ColumnMap, column_jump, transposed_jump
from detectors.model import Model
from detectors.observation import Observation
from detectors.spacing import LOG_LEVEL_RANGE

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

NO_CHANCE = 1e-100
FEW_COLUMNS = 6
"""Up to so many columns the sparse product is several times faster one by one."""


@dataclass(frozen=True)
class Phases:
    """What a gap does to the successes that a run still needs, 1 to `shape` of them.

    Attributes
    ----------
    stay : ndarray, shape (shape, shape)
        Chance that a run which needs m successes goes on and needs m' after the gap, at [m - 1, m' - 1].
    leave : ndarray, shape (shape,)
        Chance that it ends within the gap.
    """

    stay: FloatArray
    leave: FloatArray


@lru_cache(maxsize=256)
def phases(gap: GapPrior, length: int) -> Phases:
    """What a gap of a length does to the successes still needed.

    Examples
    --------
    >>> step = phases(GapPrior(shape=2, mean=20.0), 1)
    >>> step.stay.round(3).tolist(), step.leave.round(3).tolist()
    ([[0.9, 0.0], [0.1, 0.9]], [0.1, 0.0])
    """
    shape = gap.shape
    had = np.zeros(shape)
    if gap.p < 1.0:
        had = np.exp(log_successes(shape, gap.p, np.asarray(length)))[:shape]
    elif length < shape:
        had[length] = 1.0
    fewer = np.arange(shape)[:, None] - np.arange(shape)[None, :]
    stay = np.where(fewer >= 0, had[np.maximum(fewer, 0)], 0.0)
    return Phases(stay, chance_within(shape, gap.p, length))


@dataclass(frozen=True)
class Chain:
    """A record with the grids of the pairs considered.

    Attributes
    ----------
    bench : Bench
        Grids and tables.
    log_prior : ndarray, shape (pairs,)
        Log prior probability of each pair.
    counts : tuple of Observation
        The record without its missing counts.
    """

    bench: Bench
    log_prior: FloatArray
    counts: tuple[Observation, ...]

    @property
    def model(self) -> Model:
        """The model."""
        return self.bench.model

    @cached_property
    def jump(self) -> ColumnMap:
        """The jump prior applied to columns of level weights, shape (rows, columns)."""
        return column_jump(self.model.jump, self.bench.grid)

    @cached_property
    def jump_back(self) -> ColumnMap:
        """From columns of weights of the level after a shift to their expectation given the one before it."""
        return transposed_jump(self.model.jump, self.bench.grid)

    def gap(self, index: int) -> int:
        """Distance on the axis between a count and the one before it."""
        return self.counts[index].position - self.counts[index - 1].position

    def phases(self, index: int) -> Phases:
        """What the gap before a count does to the successes still needed."""
        return phases(self.model.gap, self.gap(index))

    def likelihood(self, index: int) -> Likelihood:
        """Probability of a count at each node, at least `NO_CHANCE` of the largest.

        The floor keeps a record that no run of the model could have made from losing all its weight.
        """
        said = self.bench.likelihood((self.counts[index],))
        return replace(said, probability=np.maximum(said.probability, NO_CHANCE))

    def walked(self, index: int, weights: FloatArray) -> FloatArray:
        """Level weights after the random walk over the gap before a count; the walk is its own transpose."""
        matrix = self.bench.walk(self.gap(index)).matrix
        # Far out in a tail the walk's negative outer weights can win, by next to nothing. They stay: cutting
        # them off at each step made the passes disagree by 1e-5 after 200 counts, and without it by 1e-12.
        if weights.shape[1] <= FEW_COLUMNS:
            columns: list[FloatArray] = [matrix @ np.ascontiguousarray(column) for column in weights.T]
            return np.stack(columns, axis=1)
        moved: FloatArray = matrix @ weights
        return moved

    def first_weights(self) -> FloatArray:
        """Prior of the level and the successes needed at the first count, shape (rows, shape)."""
        model, grid = self.model, self.bench.grid
        prior = grid.spread(grid.spacing)
        if isinstance(model.jump, IndependentLevels):
            prior = model.jump.density(grid.log_level) * prior
        else:
            prior = prior / LOG_LEVEL_RANGE
        needed = np.eye(1, model.gap.shape, model.gap.shape - 1)[0]
        if model.first_run == "equilibrium":
            needed = np.full(model.gap.shape, 1.0 / model.gap.shape)
        weights: FloatArray = prior[:, None] * needed
        return weights

    def by_pair(self, values: FloatArray) -> FloatArray:
        """Sums over each pair's rows, of an array of shape (rows,) or (rows, columns)."""
        sums: FloatArray = np.add.reduceat(values, self.bench.grid.start, axis=0)
        return sums

    def of_pairs(self, kept: IntArray) -> "Chain":
        """The same record with some of the pairs only."""
        bench = self.bench
        smaller = bench_for(
            bench.model,
            bench.dispersion[kept],
            bench.wander[kept],
            np.zeros(1, dtype=np.int64),
            bench.grid.of_pairs(kept),
        )
        return Chain(smaller, self.log_prior[kept], self.counts)


def chain_for(model: Model, counts: Sequence[Observation]) -> Chain:
    """Lay the grids for a record.

    Parameters
    ----------
    model : Model
        The model.
    counts : sequence of Observation
        The record without its missing counts, in order, at least one.

    Returns
    -------
    Chain
        With all pairs of dispersion and wander that the model considers.
    """
    wander = np.array([w for w, _ in model.wanders])
    weight = np.array([p for _, p in model.wanders])
    size = len(model.dispersions)
    log_prior = np.log(np.tile(weight / weight.sum() / size, size))
    dispersion, wander = np.repeat(np.array(model.dispersions), wander.size), np.tile(wander, size)
    grid = record_grid(model, dispersion, wander, counts)
    bench = bench_for(model, dispersion, wander, np.zeros(1, dtype=np.int64), grid)
    return Chain(bench, log_prior, tuple(counts))
