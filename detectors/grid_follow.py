"""Keeping the level grids where the level is: wider before a far count, finer or coarser as the level moves."""

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from detectors.bench import bench_for
from detectors.filter_state import FilterState
from detectors.grid_plan import (
    REACH_OF_COUNT,
    REACH_OF_LEVEL,
    bounded_grid,
    count_span,
    covers,
    pair_spacing,
)
from detectors.level_grid import LevelGrid
from detectors.observation import Observation
from detectors.regrid import extended, respaced
from detectors.spacing import LOWEST_LOG_LEVEL, reach

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

UPKEEP_EVERY = 4
EMPTY_ROW = 1e-8
WORTH_SHRINKING = 0.75
TOO_FINE = 2.9
SCARCE_RUN = 1e-4
STALE_FACTOR = 1e-3


def followed(state: FilterState, observation: Observation) -> FilterState:
    """Prepare the grids for a count: drop, crop and respace now and then, reach out when the count asks for it.

    Nodes that are added start empty: every run alive has seen counts that make those levels negligible.
    """
    if state.counted % UPKEEP_EVERY == 0:
        state = _respaced(_cropped(without_dropped(state)))
    return _reaching(state, observation)


def without_dropped(state: FilterState) -> FilterState:
    """The state without the pairs whose probability has become negligible."""
    least = state.bench.model.accuracy.drop_below
    kept = np.flatnonzero(np.exp(state.log_weight) >= least)
    if kept.size == state.log_weight.size:
        return state
    bench, rows = state.bench, state.grid.rows_of_pairs(kept)
    log_weight = state.log_weight[kept]
    return replace(
        state,
        bench=bench_for(bench.model, bench.dispersion[kept], bench.wander[kept], bench.grid.of_pairs(kept)),
        log_weight=log_weight - np.log(np.exp(log_weight).sum()),
        weights=state.weights[rows],
        pair_total=state.pair_total[kept],
    )


def _cropped(state: FilterState) -> FilterState:
    """Multiply stale factors in, go over to single precision, and empty cells that carry next to nothing."""
    stale = state.slots.used & (state.run_factor < STALE_FACTOR)
    weights = state.weights.astype(np.float32)
    scale = np.ones(state.run_factor.size)
    scale[stale] = state.run_factor[stale]
    per_row = state.grid.spread(1.0 / state.pair_total)
    weights *= per_row.astype(np.float32)[:, None]
    if stale.any():
        weights *= scale.astype(np.float32)
    weights[weights < state.bench.model.accuracy.crop_below] = 0.0
    factor = np.where(stale, 1.0, state.run_factor)
    return replace(state, weights=weights, run_factor=factor, pair_total=np.ones_like(state.pair_total))


def _respaced(state: FilterState) -> FilterState:
    """Refine or coarsen where the level asks for it, and give up nodes that have emptied."""
    bench, grid = state.bench, state.grid
    wanted = pair_spacing(bench.model, bench.dispersion, bench.wander, state.reference, _longest_run(state))
    wrong = (grid.spacing > wanted * 1.05) | (grid.spacing < wanted / TOO_FINE)
    spacing = np.where(wrong, wanted, grid.spacing)
    lowest, highest = _needed_range(state)
    new = bounded_grid(spacing, lowest, highest)
    wrong = new.spacing != grid.spacing
    smaller = new.size < grid.size * WORTH_SHRINKING
    if not (wrong | smaller).any():
        return state
    first = np.where(wrong | smaller, new.first, grid.first)
    size = np.where(wrong | smaller, new.size, grid.size)
    return _moved(state, LevelGrid(new.spacing, first, size), wrong)


def _longest_run(state: FilterState) -> int:
    """Longest run, in counts, that still carries weight in some pair."""
    by_slot = np.add.reduceat(state.weights, state.grid.start, axis=0) * state.run_factor
    share = (np.exp(state.log_weight) / by_slot.sum(axis=1)) @ by_slot
    heavy = state.slots.used & (share > SCARCE_RUN)
    return int(state.counted - state.slots.oldest[heavy].min() + 1)


def _needed_range(state: FilterState) -> tuple[FloatArray, FloatArray]:
    """Range of each pair's grid that holds its mass and the levels of an ordinary next count."""
    grid, dispersion = state.grid, state.bench.dispersion
    mass = state.weights @ state.run_factor.astype(state.weights.dtype)
    held = mass > EMPTY_ROW
    level = np.where(held, grid.log_level, np.nan)
    total = np.add.reduceat(mass.astype(np.float64), grid.start)
    middle = np.add.reduceat(mass * grid.log_level, grid.start) / total
    lowest = np.fmin.reduceat(level, grid.start)
    highest = np.fmax.reduceat(level, grid.start)
    far = reach(middle, dispersion, REACH_OF_LEVEL * state.bench.model.accuracy.reach)
    lowest = np.maximum(np.fmin(lowest, middle - far), LOWEST_LOG_LEVEL)
    return lowest, np.fmax(highest, middle + far)


def _reaching(state: FilterState, observation: Observation) -> FilterState:
    grid, dispersion = state.grid, state.bench.dispersion
    far = state.bench.model.accuracy.reach
    short = ~covers(grid, observation, dispersion, far)
    if not short.any():
        return state
    low, high = count_span(observation, dispersion, REACH_OF_COUNT * far)
    lowest = np.where(short, np.minimum(low, grid.lowest), grid.lowest)
    highest = np.where(short, np.maximum(high, grid.highest), grid.highest)
    new = bounded_grid(grid.spacing, lowest, highest)
    return _moved(state, new, new.spacing != grid.spacing)


def _moved(state: FilterState, new: LevelGrid, respace: NDArray[np.bool_]) -> FilterState:
    """Carry the weights to new grids; pairs with another spacing are interpolated."""
    old = state.grid
    weights = extended(state.weights, old, new)
    for pair in np.flatnonzero(respace).tolist():
        source = slice(int(old.start[pair]), int(old.start[pair] + old.size[pair]))
        target = slice(int(new.start[pair]), int(new.start[pair] + new.size[pair]))
        weights[target] = respaced(state.weights[source], old.log_level[source], new.log_level[target])
    bench = state.bench
    return replace(
        state,
        bench=bench_for(bench.model, bench.dispersion, bench.wander, new),
        weights=weights,
        pair_total=np.add.reduceat(weights, new.start, axis=0) @ state.run_factor,
    )
