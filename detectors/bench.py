"""What the filter prepares once for a set of grids and uses at every count."""

import copy
from collections import OrderedDict
from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from detectors.counts import NegativeBinomialRows, effective_dispersion, log_negative_binomial
from detectors.jump_step import Map, jump_step
from detectors.level_grid import LevelGrid
from detectors.model import Model
from detectors.observation import Observation
from detectors.one_off import one_off_probability
from detectors.spacing import resolvable_dispersion
from detectors.wander_kernel import walk_matrix

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

MOST_WALKS = 8
LEAST = 1e-300
LARGEST_FACTOR = 1e30
UNEXPLAINED = 1e-25


@dataclass(frozen=True)
class Walk:
    """The random walk over one gap, with the row of each stored weight."""

    matrix: "sparse.csr_array"
    per_row: NDArray[np.int64]
    in_single: NDArray[np.float32]

    def plain(self, dtype: "np.dtype[np.floating]") -> "sparse.csr_array":
        """The walk alone."""
        if dtype != np.float32:
            return self.matrix
        result = copy.copy(self.matrix)
        result.data = self.in_single
        return result

    def scaled(self, factor: FloatArray, dtype: "np.dtype[np.floating]") -> "sparse.csr_array":
        """The walk followed by a multiplication of each row."""
        data = self.in_single if dtype == np.float32 else self.matrix.data
        result = copy.copy(self.matrix)
        # The factors of a pair that has no weight left may be beyond single precision.
        bounded = np.minimum(factor, LARGEST_FACTOR).astype(dtype, copy=False)
        result.data = data * bounded.repeat(self.per_row)
        return result


@dataclass(frozen=True)
class Likelihood:
    """Probability of one count at each node.

    Attributes
    ----------
    probability : ndarray, shape (rows,)
        Probability divided by exp(`log_scale`).
    one_off_share : ndarray, shape (rows,)
        Share of it that the one-off component has.
    negative_binomial : ndarray, shape (rows,)
        Probability under the negative binomial component alone, not divided.
    log_scale : ndarray, shape (streams,)
        Largest log probability over the rows of each stream.
    """

    probability: FloatArray
    one_off_share: FloatArray
    negative_binomial: FloatArray
    log_scale: FloatArray


@dataclass(frozen=True)
class Bench:
    """Matrices and tables for one set of grids; shared by all states that stand on them.

    Several streams may stand side by side; the pairs of one are neighbours, from `first_pair` on.
    """

    model: Model
    dispersion: FloatArray
    wander: FloatArray
    first_pair: IntArray
    grid: LevelGrid
    level: FloatArray
    row_dispersion: FloatArray
    rows: NegativeBinomialRows
    jump: Map
    _walks: "OrderedDict[int, Walk]" = field(default_factory=OrderedDict)

    @cached_property
    def dispersions(self) -> tuple[FloatArray, IntArray]:
        """The values of the dispersion still considered, and which of them each pair has."""
        return np.unique(self.dispersion, return_inverse=True)

    @cached_property
    def wanders(self) -> tuple[FloatArray, IntArray]:
        """The values of the wander still considered, and which of them each pair has."""
        return np.unique(self.wander, return_inverse=True)

    def walk(self, gap: int) -> Walk:
        """The random walk over a gap; the last few are kept."""
        known = self._walks.get(gap)
        if known is None:
            matrix = walk_matrix(self.grid, self.wander * np.sqrt(float(gap)))
            known = Walk(matrix, np.diff(matrix.indptr).astype(np.int64), matrix.data.astype(np.float32))
            self._walks[gap] = known
            while len(self._walks) > MOST_WALKS:
                self._walks.popitem(last=False)
        return known

    @cached_property
    def rows_of_stream(self) -> IntArray:
        """Number of rows of each stream."""
        return np.add.reduceat(self.grid.size, self.first_pair)

    @cached_property
    def first_row(self) -> IntArray:
        """First row of each stream."""
        return self.grid.start[self.first_pair]

    @cached_property
    def pairs_of_stream(self) -> IntArray:
        """Number of pairs of each stream."""
        return np.diff(np.append(self.first_pair, self.dispersion.size))

    @property
    def streams(self) -> int:
        """Number of streams that stand side by side."""
        return int(self.first_pair.size)

    def over_rows(self, values: FloatArray) -> FloatArray:
        """One value a stream, for each of its rows; of a single stream, the value."""
        return values[0] if values.size == 1 else values.repeat(self.rows_of_stream)

    def over_pairs(self, values: FloatArray) -> FloatArray:
        """One value a stream, for each of its pairs."""
        return values.repeat(self.pairs_of_stream)

    def likelihood(self, counts: Sequence[Observation]) -> Likelihood:
        """Probability of each stream's count at each of its nodes (missing counts have none)."""
        exact = np.array([float(one.count or 0) for one in counts])
        count = self.over_rows(exact)
        exposure = self.over_rows(np.array([one.exposure for one in counts]))
        relative_sd = self.over_rows(np.array([one.relative_sd for one in counts]))
        mean = self.level * exposure
        if np.any(relative_sd > 0.0):
            dispersion = effective_dispersion(self.row_dispersion, relative_sd)
            log_ordinary = log_negative_binomial(count, mean, dispersion)
        else:
            log_ordinary = self.rows.log_probability(self.over_pairs(exact), exposure)
        if self.model.one_off_share == 0.0:
            return self._without_one_offs(log_ordinary)
        total, one_off, ordinary = self._mixed(count, mean, log_ordinary)
        largest = np.maximum.reduceat(total, self.first_row)
        return Likelihood(total / self.over_rows(largest), one_off / total, ordinary, np.log(largest))

    def _without_one_offs(self, log_ordinary: FloatArray) -> Likelihood:
        """In logs up to the division: without the broad component a count may be next to impossible.

        Not less than `UNEXPLAINED` of the best node's probability, so that after two counts that no run of
        the model explains something is left to go on with.
        """
        largest = np.maximum.reduceat(log_ordinary, self.first_row)
        probability = np.maximum(np.exp(log_ordinary - self.over_rows(largest)), UNEXPLAINED)
        return Likelihood(probability, np.zeros_like(probability), np.exp(log_ordinary), largest)

    def log_likelihood_at(self, rows: IntArray, counts: Sequence[Observation]) -> FloatArray:
        """Log probability of each stream's count at some of the nodes, shape of `rows`."""
        stream = np.searchsorted(self.first_row, rows, side="right") - 1
        count = np.array([float(one.count or 0) for one in counts])[stream]
        mean = self.level[rows] * np.array([one.exposure for one in counts])[stream]
        relative_sd = np.array([one.relative_sd for one in counts])[stream]
        dispersion = effective_dispersion(self.row_dispersion[rows], relative_sd)
        total, _, _ = self._mixed(count, mean, log_negative_binomial(count, mean, dispersion))
        return np.log(np.maximum(total, LEAST))

    def _mixed(
        self, count: FloatArray, mean: FloatArray, log_ordinary: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        share, ordinary = self.model.one_off_share, np.exp(log_ordinary)
        one_off = share * one_off_probability(count, mean, self.model.one_off_tail)
        return (1.0 - share) * ordinary + one_off, one_off, ordinary


def bench_for(
    model: Model, dispersion: FloatArray, wander: FloatArray, first_pair: IntArray, grid: LevelGrid
) -> Bench:
    """Prepare the matrices and tables of a set of grids."""
    level, resolvable = np.exp(grid.log_level), resolvable_dispersion(grid.spacing, grid.highest, dispersion)
    return Bench(
        model=model,
        dispersion=dispersion,
        wander=wander,
        first_pair=first_pair,
        grid=grid,
        level=level,
        row_dispersion=grid.spread(resolvable),
        rows=NegativeBinomialRows(level, resolvable, grid.pair),
        jump=jump_step(model.jump, grid),
    )
