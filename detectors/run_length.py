"""The filter: run length, level, dispersion and wander, one count at a time."""

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from detectors.bench import Likelihood, bench_for
from detectors.errors import NotInOrder
from detectors.filter_state import FilterState, Step
from detectors.grid_follow import followed, without_dropped
from detectors.grid_plan import TOLERATED_RISE, covers, first_grid, reference_level
from detectors.jump_prior import IndependentLevels
from detectors.model import Model
from detectors.observation import Observation
from detectors.quantiles import quantiles_and_reference
from detectors.run_slots import BLOCK, RunSlots, after_merge, first_slot, merges_due, with_new_run
from detectors.spacing import LOG_LEVEL_RANGE

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


def first_count(model: Model, observation: Observation) -> tuple[FilterState, Step]:
    """Fold the first count of a stream."""
    return _first(model, (observation,), observation)


def next_count(state: FilterState, observation: Observation) -> tuple[FilterState, Step]:
    """Fold one more count.

    Raises
    ------
    NotInOrder
        If the observation does not lie after the last one.
    """
    if observation.position <= state.position:
        raise NotInOrder(state.position, observation.position)
    after, step = _update(_prepared(state, observation), observation)
    if after.counted < after.bench.model.accuracy.early or after.weights.dtype == np.float32:
        return after, step
    return replace(after, weights=after.weights.astype(np.float32)), step


def _prepared(state: FilterState, observation: Observation) -> FilterState:
    if isinstance(state.bench.model.jump, IndependentLevels):
        return without_dropped(state)
    if state.counted >= state.bench.model.accuracy.early:
        return followed(state, observation)
    return without_dropped(_refolded(state, observation))


def _refolded(state: FilterState, observation: Observation) -> FilterState:
    """While counts are few: lay the grids anew for all of them and fold them again, if they do not suit."""
    model, counts = state.bench.model, (*state.early, observation)
    risen = reference_level(counts) > state.reference + TOLERATED_RISE
    if not risen and bool(
        covers(state.grid, observation, state.bench.dispersion, model.accuracy.reach).all()
    ):
        return state
    folded, _ = _first(model, counts, state.early[0])
    for earlier in state.early[1:]:
        folded, _ = _update(folded, earlier)
    return replace(folded, early=state.early)


def _pairs(model: Model) -> tuple[FloatArray, FloatArray, FloatArray]:
    wander = np.array([w for w, _ in model.wanders])
    prior = np.array([p for _, p in model.wanders])
    count = len(model.dispersions)
    weight = np.tile(prior / prior.sum() / count, count)
    return np.repeat(np.array(model.dispersions), wander.size), np.tile(wander, count), np.log(weight)


def _first(model: Model, plan: tuple[Observation, ...], observation: Observation) -> tuple[FilterState, Step]:
    dispersion, wander, log_prior = _pairs(model)
    bench = bench_for(model, dispersion, wander, first_grid(model, dispersion, wander, plan))
    spacing = bench.grid.spread(bench.grid.spacing)
    if isinstance(model.jump, IndependentLevels):
        prior = model.jump.density(bench.grid.log_level) * spacing
    else:
        prior = spacing / LOG_LEVEL_RANGE
    likelihood = bench.likelihood(observation)
    weights = np.zeros((bench.grid.rows, BLOCK))
    weights[:, 0] = prior * likelihood.probability
    state = FilterState(
        bench=bench,
        counted=1,
        position=observation.position,
        log_weight=log_prior,
        weights=weights,
        run_factor=np.ones(BLOCK),
        pair_total=np.ones(dispersion.size),
        slots=first_slot(observation.position),
        reference=reference_level(plan),
        early=plan[:1],
    )
    return _weighed(state, likelihood)


def _hazard(state: FilterState, gap: int) -> FloatArray:
    prior, slots = state.bench.model.gap, state.slots
    age = np.maximum(state.position - slots.start_position, 0)
    hazard = np.where(slots.used, prior.shift_within(age, gap), 0.0)
    if state.bench.model.first_run == "equilibrium":
        hazard[0] = prior.first_shift_within(age[:1], gap)[0]
    return hazard


def _update(state: FilterState, observation: Observation) -> tuple[FilterState, Step]:
    bench, weights = state.bench, state.weights
    gap = observation.position - state.position
    hazard = _hazard(state, gap)
    likelihood = bench.likelihood(observation)
    row_factor = likelihood.probability / bench.grid.spread(state.pair_total)
    walk = bench.walk(gap)
    shifting = weights @ (state.run_factor * hazard).astype(weights.dtype)
    moved = walk.scaled(row_factor, weights.dtype) @ weights
    slots, slot = _free_slot(state.slots)
    factor = state.run_factor * (1.0 - hazard)
    if slots.used.size > moved.shape[1]:
        moved = np.concatenate((moved, np.zeros((moved.shape[0], BLOCK), dtype=moved.dtype)), axis=1)
        factor = np.concatenate((factor, np.zeros(BLOCK)))
    moved[:, slot] = bench.jump(walk.plain(weights.dtype) @ shifting) * row_factor
    factor[slot] = 1.0
    counted = state.counted + 1
    after = replace(
        state,
        counted=counted,
        position=observation.position,
        weights=moved,
        run_factor=factor,
        slots=with_new_run(slots, slot, counted, observation.position),
        early=_remembered(state, observation),
    )
    return _weighed(after, likelihood)


def _remembered(state: FilterState, observation: Observation) -> tuple[Observation, ...]:
    still_early = state.early and state.counted + 1 < state.bench.model.accuracy.early
    return (*state.early, observation) if still_early else ()


def _free_slot(slots: RunSlots) -> tuple[RunSlots, int]:
    free = np.flatnonzero(~slots.used)
    if free.size:
        return slots, int(free[0])
    return slots.grown(), slots.used.size


def _weighed(state: FilterState, likelihood: Likelihood) -> tuple[FilterState, Step]:
    """Weigh runs and pairs by what the count said, and merge old runs."""
    grid = state.grid
    by_slot = np.add.reduceat(state.weights, grid.start, axis=0) * state.run_factor
    total = by_slot.sum(axis=1)
    # A pair that gives the count no chance at all is as good as dropped; a tiny floor keeps the logs finite.
    log_weight = state.log_weight + np.log(np.maximum(total, 1e-290))
    top = log_weight.max()
    log_sum = top + np.log(np.exp(log_weight - top).sum())
    log_weight = log_weight - log_sum
    share = np.exp(log_weight) / np.maximum(total, 1e-290)
    run_mass = share @ by_slot
    in_pair = state.weights @ state.run_factor.astype(state.weights.dtype)
    row_mass = in_pair * grid.spread(share)
    level, reference = quantiles_and_reference(grid, row_mass)
    weighed = replace(
        state,
        log_weight=log_weight,
        pair_total=np.maximum(total, 1e-290),
        reference=state.reference if state.early else reference,
    )
    step = Step(
        log_predictive=float(log_sum) + likelihood.log_scale,
        likelihood=likelihood,
        row_mass=row_mass,
        level=level,
        run_mass=run_mass,
        slots=state.slots,
    )
    return _merged(weighed, run_mass), step


def _merged(state: FilterState, run_mass: FloatArray) -> FilterState:
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
        share = float(mass[kept] / both) if both > 0.0 else 0.5
        slots = after_merge(slots, kept, emptied, share)
        mass[kept] = both
    return replace(state, weights=weights, run_factor=factor, slots=slots)
