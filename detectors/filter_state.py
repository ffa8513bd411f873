"""What the filter knows after a count, and what one count did."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from detectors.bench import Bench, Likelihood
from detectors.level_grid import LevelGrid
from detectors.observation import Observation
from detectors.posterior import Quantiles
from detectors.quantiles import level_quantiles
from detectors.recent_runs import RecentRuns
from detectors.run_slots import RunSlots

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class FilterState:
    """All that the filter knows after a count. A step returns a new state and changes none.

    Attributes
    ----------
    bench : Bench
        The model, the pairs of dispersion and wander still considered, and their grids.
    counted : int
        Number of counts folded.
    position : int
        Position of the last count.
    log_weight : ndarray, shape (pairs,)
        Log posterior probability of each pair.
    weights : ndarray, shape (rows, slots)
        Weight of each node and run, to be multiplied by `run_factor`.
    run_factor : ndarray, shape (slots,)
        Factor of each run's column: survival not yet multiplied in.
    pair_total : ndarray, shape (pairs,)
        Total of each pair's weights.
    slots : RunSlots
        The runs.
    reference : ndarray, shape (streams,)
        Log level for which the spacing was chosen while counts were few.
    recent : RecentRuns
        What the youngest runs would weigh at levels beyond the grids.
    early : tuple of tuple of Observation
        The counts so far, as long as there are few: for each position one a stream.
    """

    bench: Bench
    counted: int
    position: int
    log_weight: FloatArray
    weights: NDArray[np.floating]
    run_factor: FloatArray
    pair_total: FloatArray
    slots: RunSlots
    reference: FloatArray
    recent: RecentRuns
    early: tuple[tuple[Observation, ...], ...]

    @property
    def grid(self) -> LevelGrid:
        """The level grids."""
        return self.bench.grid


@dataclass(frozen=True)
class Step:
    """What one count (of each stream) did, before it is summarised.

    Attributes
    ----------
    log_predictive : ndarray, shape (streams,)
        Log probability of the count given those before it.
    likelihood : Likelihood
        Its probability at each node.
    grid : LevelGrid
        The grids on which the step was made.
    row_mass : ndarray, shape (rows,)
        Posterior probability of each node of its stream, pairs weighted.
    run_mass : ndarray, shape (streams, slots)
        Posterior probability of each slot.
    slots : RunSlots
        The runs that the slots held, before old ones were merged.
    """

    log_predictive: FloatArray
    likelihood: Likelihood
    grid: LevelGrid
    row_mass: FloatArray
    run_mass: FloatArray
    slots: RunSlots

    @cached_property
    def level(self) -> Quantiles:
        """Quantiles of the level, where one stream stands alone."""
        return level_quantiles(self.grid, self.row_mass)
