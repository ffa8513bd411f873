"""Keeping the level grids where the level is: wider before a far count, finer or coarser as it moves."""

from collections.abc import Sequence
from dataclasses import replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from detectors.bench import bench_for
from detectors.filter_state import FilterState
from detectors.grid_plan import (
    NEEDED_REACH,
    REACH_OF_COUNT,
    REACH_OF_LEVEL,
    bounded_grid,
    count_span,
    log_level_of,
    pair_spacing,
)
from detectors.level_grid import LevelGrid
from detectors.observation import Observation
from detectors.quantiles import upper_log_level
from detectors.recent_runs import fill
from detectors.regrid import extended, respaced
from detectors.spacing import LOWEST_LOG_LEVEL, reach

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

UPKEEP_EVERY = 4
EMPTY_ROW = 1e-6
WORTH_SHRINKING = 0.85
TOO_FINE = 2.9
SCARCE_RUN = 1e-4
STALE_FACTOR = 1e-3
REFERENCE_SHARE = 0.99


def followed(state: FilterState, counts: Sequence[Observation]) -> FilterState:
    """Prepare the grids for a count: drop, crop and respace now and then, reach out when the count asks.

    Nodes that are added hold what the youngest runs would weigh there (see `recent_runs`).
    """
    if state.counted % UPKEEP_EVERY == 0:
        state = _respaced(_cropped(without_dropped(state)))
    return _reaching(state, counts)


def covers(state: FilterState, counts: Sequence[Observation]) -> NDArray[np.bool_]:
    """Whether each pair's grid spans the levels that its stream's count makes likely."""
    grid = state.grid
    lowest, highest = _span_of(state, counts, NEEDED_REACH)
    return (grid.lowest <= lowest + grid.spacing) & (highest - grid.spacing <= grid.highest)


def without_dropped(state: FilterState) -> FilterState:
    """The state without the pairs whose probability has become negligible."""
    bench = state.bench
    keep = np.exp(state.log_weight) >= bench.model.accuracy.drop_below
    if keep.all():
        return state
    kept = np.flatnonzero(keep)
    left = np.add.reduceat(keep.astype(np.int64), bench.first_pair)
    first_pair = np.concatenate(([0], np.cumsum(left)[:-1])).astype(np.int64)
    smaller = bench_for(
        bench.model, bench.dispersion[kept], bench.wander[kept], first_pair, bench.grid.of_pairs(kept)
    )
    log_weight = state.log_weight[kept]
    log_total = np.log(np.add.reduceat(np.exp(log_weight), first_pair))
    return replace(
        state,
        bench=smaller,
        log_weight=log_weight - smaller.over_pairs(log_total),
        weights=state.weights[bench.grid.rows_of_pairs(kept)],
        pair_total=state.pair_total[kept],
        recent=state.recent.of_pairs(kept),
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
    return replace(
        state,
        weights=weights,
        run_factor=factor,
        pair_total=np.ones_like(state.pair_total),
        recent=state.recent.divided(np.log(state.pair_total)),
    )


def _respaced(state: FilterState) -> FilterState:
    """Refine or coarsen where the level asks for it, and give up nodes that have emptied."""
    bench, grid = state.bench, state.grid
    level, longest = bench.over_pairs(_upper_levels(state)), bench.over_pairs(_longest_runs(state))
    wanted = pair_spacing(bench.model, bench.dispersion, bench.wander, level, longest)
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


def _upper_levels(state: FilterState) -> FloatArray:
    """An upper quantile of each stream's log level, for which its spacing is chosen; shape (streams,)."""
    bench, grid = state.bench, state.grid
    mass = (state.weights @ state.run_factor.astype(state.weights.dtype)).astype(np.float64)
    mass *= grid.spread(np.exp(state.log_weight) / state.pair_total)
    ends = np.append(bench.first_row, grid.rows)
    return np.array(
        [
            upper_log_level(grid.log_level[begin:end], mass[begin:end], REFERENCE_SHARE)
            for begin, end in pairwise(ends.tolist())
        ]
    )


def _longest_runs(state: FilterState) -> FloatArray:
    """Longest run, in counts, that still carries weight in each stream; shape (streams,)."""
    if not (state.bench.wander == 0.0).any():
        return np.ones(state.bench.streams)
    by_slot = np.add.reduceat(state.weights, state.grid.start, axis=0) * state.run_factor
    share = np.exp(state.log_weight) / by_slot.sum(axis=1)
    run_mass = np.add.reduceat(share[:, None] * by_slot, state.bench.first_pair, axis=0)
    heavy = state.slots.used & (run_mass > SCARCE_RUN)
    oldest = np.where(heavy, state.slots.oldest, state.counted)
    return np.asarray(state.counted - oldest.min(axis=1) + 1, dtype=np.float64)


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


def _reaching(state: FilterState, counts: Sequence[Observation]) -> FilterState:
    grid, short = state.grid, ~covers(state, counts)
    if not short.any():
        return state
    low, high = _span_of(state, counts, REACH_OF_COUNT)
    lowest = np.where(short, np.minimum(low, grid.lowest), grid.lowest)
    highest = np.where(short, np.maximum(high, grid.highest), grid.highest)
    new = bounded_grid(grid.spacing, lowest, highest)
    return _moved(state, new, new.spacing != grid.spacing)


def _span_of(state: FilterState, counts: Sequence[Observation], sds: float) -> tuple[FloatArray, FloatArray]:
    bench = state.bench
    level = bench.over_pairs(np.array([log_level_of(one) for one in counts]))
    is_zero = bench.over_pairs(np.array([float(one.count == 0) for one in counts]))
    return count_span(level, is_zero, bench.dispersion, sds * bench.model.accuracy.reach)


def _moved(state: FilterState, new: LevelGrid, respace: NDArray[np.bool_]) -> FilterState:
    """Carry the weights to new grids; pairs with another spacing are interpolated."""
    old = state.grid
    weights = extended(state.weights, old, new)
    for pair in np.flatnonzero(respace).tolist():
        source = slice(int(old.start[pair]), int(old.start[pair] + old.size[pair]))
        target = slice(int(new.start[pair]), int(new.start[pair] + new.size[pair]))
        weights[target] = respaced(state.weights[source], old.log_level[source], new.log_level[target])
    bench = bench_for(
        state.bench.model, state.bench.dispersion, state.bench.wander, state.bench.first_pair, new
    )
    beyond = (new.log_level < new.spread(old.lowest) - 1e-9) | (
        new.log_level > new.spread(old.highest) + 1e-9
    )
    filled = fill(
        weights,
        np.flatnonzero(beyond),
        bench,
        state.recent,
        state.slots,
        state.run_factor,
        state.pair_total,
    )
    return replace(state, bench=bench, weights=weights, pair_total=state.pair_total + filled)
