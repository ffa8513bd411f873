"""The filter: run length, level, dispersion and wander, one count at a time.

Several streams may be folded side by side, as simulations do: they must have the same positions, and so the
same runs; each has its own counts, pairs, grids and weights.
"""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from detectors.bench import Bench, Likelihood, bench_for
from detectors.errors import NotInOrder
from detectors.filter_state import FilterState, Step
from detectors.grid_follow import covers, followed, without_dropped
from detectors.grid_plan import TOLERATED_RISE, first_grid, reference_level
from detectors.jump_prior import IndependentLevels
from detectors.level_grid import LevelGrid
from detectors.model import Model
from detectors.observation import Observation
from detectors.recent_runs import none_recent, remembered
from detectors.run_slots import BLOCK, RunSlots, after_merge, first_slot, merges_due, with_new_run
from detectors.spacing import LOG_LEVEL_RANGE

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
Counts = Sequence[Observation]

NO_CHANCE = 1e-290
"""A pair that gives a count no chance at all is as good as dropped; this floor keeps the logs finite."""


def first_count(model: Model, counts: Counts) -> tuple[FilterState, Step]:
    """Fold the first count of each stream.

    Parameters
    ----------
    model : Model
        The model, one for all streams.
    counts : sequence of Observation
        One a stream, all at one position, none missing.

    Returns
    -------
    FilterState, Step
    """
    return _first(model, (tuple(counts),), tuple(counts))


def next_count(state: FilterState, counts: Counts) -> tuple[FilterState, Step]:
    """Fold one more count of each stream.

    Parameters
    ----------
    state : FilterState
        The state before; it is not changed.
    counts : sequence of Observation
        One a stream, all at one position, none missing.

    Returns
    -------
    FilterState, Step

    Raises
    ------
    NotInOrder
        If the position does not lie after the last one.
    """
    if counts[0].position <= state.position:
        raise NotInOrder(state.position, counts[0].position)
    after, step = _update(_prepared(state, tuple(counts)), tuple(counts))
    if after.counted < after.bench.model.accuracy.early or after.weights.dtype == np.float32:
        return after, step
    return replace(after, weights=after.weights.astype(np.float32)), step


def _prepared(state: FilterState, counts: tuple[Observation, ...]) -> FilterState:
    if isinstance(state.bench.model.jump, IndependentLevels):
        return without_dropped(state)
    if state.counted >= state.bench.model.accuracy.early:
        return followed(state, counts)
    return without_dropped(_refolded(state, counts))


def _refolded(state: FilterState, counts: tuple[Observation, ...]) -> FilterState:
    """While counts are few: lay the grids anew for all of them and fold them again, if they do not suit."""
    model, seen = state.bench.model, (*state.early, counts)
    risen = _references(seen) > state.reference + TOLERATED_RISE
    if not risen.any() and bool(covers(state, counts).all()):
        return state
    folded, _ = _first(model, seen, state.early[0])
    for earlier in state.early[1:]:
        folded, _ = _update(folded, earlier)
    return replace(folded, early=state.early)


def _references(seen: tuple[tuple[Observation, ...], ...]) -> FloatArray:
    return np.array([reference_level(stream) for stream in zip(*seen, strict=True)])


def _pairs(model: Model) -> tuple[FloatArray, FloatArray, FloatArray]:
    wander = np.array([w for w, _ in model.wanders])
    prior = np.array([p for _, p in model.wanders])
    count = len(model.dispersions)
    weight = np.tile(prior / prior.sum() / count, count)
    return np.repeat(np.array(model.dispersions), wander.size), np.tile(wander, count), np.log(weight)


def _first_bench(model: Model, seen: tuple[tuple[Observation, ...], ...]) -> tuple[Bench, FloatArray]:
    dispersion, wander, log_prior = _pairs(model)
    grids = [first_grid(model, dispersion, wander, stream) for stream in zip(*seen, strict=True)]
    grid = LevelGrid(
        *(np.concatenate([getattr(g, name) for g in grids]) for name in ("spacing", "first", "size"))
    )
    streams = len(grids)
    first_pair = np.arange(streams, dtype=np.int64) * dispersion.size
    bench = bench_for(model, np.tile(dispersion, streams), np.tile(wander, streams), first_pair, grid)
    return bench, np.tile(log_prior, streams)


def _first(
    model: Model, seen: tuple[tuple[Observation, ...], ...], counts: tuple[Observation, ...]
) -> tuple[FilterState, Step]:
    bench, log_prior = _first_bench(model, seen)
    prior = bench.grid.spread(bench.grid.spacing)
    if isinstance(model.jump, IndependentLevels):
        prior = model.jump.density(bench.grid.log_level) * prior
    else:
        prior = prior / LOG_LEVEL_RANGE
    likelihood = bench.likelihood(counts)
    weights = np.zeros((bench.grid.rows, BLOCK))
    weights[:, 0] = prior * likelihood.probability
    state = FilterState(
        bench=bench,
        counted=1,
        position=counts[0].position,
        log_weight=log_prior,
        weights=weights,
        run_factor=np.ones(BLOCK),
        pair_total=np.ones(log_prior.size),
        slots=first_slot(counts[0].position),
        reference=_references(seen),
        recent=none_recent(log_prior.size),
        early=(counts,),
    )
    return _weighed(state, likelihood)


def _hazard(state: FilterState, gap: int) -> FloatArray:
    prior, slots = state.bench.model.gap, state.slots
    age = np.maximum(state.position - slots.start_position, 0)
    hazard = np.where(slots.used, prior.shift_within(age, gap), 0.0)
    if state.bench.model.first_run == "equilibrium":
        hazard[0] = prior.first_shift_within(age[:1], gap)[0]
    return hazard


def _update(state: FilterState, counts: tuple[Observation, ...]) -> tuple[FilterState, Step]:
    bench, weights, position = state.bench, state.weights, counts[0].position
    gap = position - state.position
    hazard = _hazard(state, gap)
    likelihood = bench.likelihood(counts)
    row_factor = likelihood.probability / bench.grid.spread(state.pair_total)
    walk = bench.walk(gap)
    shifting = weights @ (state.run_factor * hazard).astype(weights.dtype)
    moved = walk.scaled(row_factor, weights.dtype) @ weights
    slots, slot = _free_slot(state.slots)
    factor = state.run_factor * (1.0 - hazard)
    if slots.used.size > moved.shape[1]:
        moved = np.concatenate((moved, np.zeros((moved.shape[0], BLOCK), dtype=moved.dtype)), axis=1)
        factor = np.concatenate((factor, np.zeros(BLOCK)))
    arriving = np.maximum(walk.plain(weights.dtype) @ shifting, 0.0)
    moved[:, slot] = bench.jump(arriving) * row_factor
    factor[slot] = 1.0
    counted = state.counted + 1
    recent = remembered(state.recent, bench, arriving.astype(np.float64), counts, counted)
    after = replace(
        state,
        counted=counted,
        position=position,
        weights=moved,
        run_factor=factor,
        slots=with_new_run(slots, slot, counted, position),
        recent=recent.divided(np.log(state.pair_total) + bench.over_pairs(likelihood.log_scale)),
        early=_remembered(state, counts),
    )
    return _weighed(after, likelihood)


def _remembered(state: FilterState, counts: tuple[Observation, ...]) -> tuple[tuple[Observation, ...], ...]:
    still_early = state.early and state.counted + 1 < state.bench.model.accuracy.early
    return (*state.early, counts) if still_early else ()


def _free_slot(slots: RunSlots) -> tuple[RunSlots, int]:
    free = np.flatnonzero(~slots.used)
    if free.size:
        return slots, int(free[0])
    return slots.grown(), slots.used.size


def _weighed(state: FilterState, likelihood: Likelihood) -> tuple[FilterState, Step]:
    """Weigh runs and pairs by what the count said, and merge old runs."""
    bench, grid = state.bench, state.grid
    by_slot = np.add.reduceat(state.weights, grid.start, axis=0) * state.run_factor
    summed = by_slot.sum(axis=1)
    if summed.min() < NO_CHANCE:
        state = replace(state, recent=state.recent.forgotten(summed < NO_CHANCE))
    total = np.maximum(summed, NO_CHANCE)
    log_weight = state.log_weight + np.log(total)
    top = np.maximum.reduceat(log_weight, bench.first_pair)
    relative = np.exp(log_weight - bench.over_pairs(top))
    log_sum = top + np.log(np.add.reduceat(relative, bench.first_pair))
    log_weight = log_weight - bench.over_pairs(log_sum)
    share = np.exp(log_weight) / total
    in_pair = state.weights @ state.run_factor.astype(state.weights.dtype)
    step = Step(
        log_predictive=log_sum + likelihood.log_scale,
        likelihood=likelihood,
        grid=grid,
        row_mass=np.maximum(in_pair * grid.spread(share), 0.0),
        # Far out in a tail the walk's negative outer weights can win, by less than a millionth of the peak.
        run_mass=np.maximum(_by_stream(share, by_slot, bench), 0.0),
        slots=state.slots,
    )
    return _merged(replace(state, log_weight=log_weight, pair_total=total), step.run_mass.mean(axis=0)), step


def _by_stream(share: FloatArray, by_slot: FloatArray, bench: Bench) -> FloatArray:
    if bench.streams == 1:
        return (share @ by_slot)[None, :]
    return np.asarray(np.add.reduceat(share[:, None] * by_slot, bench.first_pair, axis=0))


def _merged(state: FilterState, run_mass: FloatArray) -> FilterState:
    """Merge old runs; of streams side by side the mean probability says which age stands for a group."""
    due = merges_due(state.slots, state.counted, state.bench.model.accuracy)
    if not due:
        return state
    weights, factor, slots = state.weights, state.run_factor.copy(), state.slots
    mass = run_mass.copy()
    for kept, emptied in due:
        weights[:, kept] = weights[:, kept] * factor[kept] + weights[:, emptied] * factor[emptied]
        weights[:, emptied] = 0.0
        factor[kept], factor[emptied] = 1.0, 0.0
        both = mass[kept] + mass[emptied]
        slots = after_merge(slots, kept, emptied, float(mass[kept] / both) if both > 0.0 else 0.5)
        mass[kept] = both
    return replace(state, weights=weights, run_factor=factor, slots=slots)
