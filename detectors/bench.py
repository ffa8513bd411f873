"""What the filter prepares once for a set of grids and uses at every count."""

import copy
from collections import OrderedDict
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
from detectors.one_off import log_one_off
from detectors.wander_kernel import walk_matrix

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

MOST_WALKS = 8


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
        result.data = data * np.repeat(factor.astype(dtype, copy=False), self.per_row)
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
    log_scale : float
        Largest log probability over the rows.
    """

    probability: FloatArray
    one_off_share: FloatArray
    negative_binomial: FloatArray
    log_scale: float


@dataclass(frozen=True)
class Bench:
    """Matrices and tables for one set of grids; shared by all states that stand on them."""

    model: Model
    dispersion: FloatArray
    wander: FloatArray
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

    def likelihood(self, observation: Observation) -> Likelihood:
        """Probability of a count at each node (missing counts have none)."""
        count = observation.count if observation.count is not None else 0
        mean = self.level * observation.exposure
        if observation.relative_sd == 0.0:
            log_nb = self.rows.log_probability(count, observation.exposure)
        else:
            dispersion = effective_dispersion(self.row_dispersion, observation.relative_sd)
            log_nb = log_negative_binomial(count, mean, dispersion)
        negative_binomial = np.exp(log_nb)
        share = self.model.one_off_share
        if share == 0.0:
            scale = float(log_nb.max())
            return Likelihood(np.exp(log_nb - scale), np.zeros_like(mean), negative_binomial, scale)
        one_off = share * np.exp(log_one_off(count, mean, self.model.one_off_tail))
        total = (1.0 - share) * negative_binomial + one_off
        largest = float(total.max())
        return Likelihood(total / largest, one_off / total, negative_binomial, float(np.log(largest)))


def bench_for(model: Model, dispersion: FloatArray, wander: FloatArray, grid: LevelGrid) -> Bench:
    """Prepare the matrices and tables of a set of grids."""
    level, row_dispersion = np.exp(grid.log_level), grid.spread(dispersion)
    return Bench(
        model=model,
        dispersion=dispersion,
        wander=wander,
        grid=grid,
        level=level,
        row_dispersion=row_dispersion,
        rows=NegativeBinomialRows(level, row_dispersion),
        jump=jump_step(model.jump, grid),
    )
