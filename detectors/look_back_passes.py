"""The forward and the backward pass over a whole record."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from detectors.look_back_chain import Chain

FloatArray = NDArray[np.float64]

NO_CHANCE = 1e-290
"""A pair that gives a count no chance at all is as good as dropped; this floor keeps the logs finite."""
HOPELESS_EVERY = 16
LOG_HOPELESS = -80.0
"""A pair that has fallen so far behind the best one (a factor of 1e-35) is not followed to the end."""


@dataclass(frozen=True)
class Passes:
    """A record after both passes. Row weights are per pair: each pair's sum to 1 where nothing else is said.

    Attributes
    ----------
    chain : Chain
        The record, with the pairs kept.
    pair_weight : ndarray, shape (pairs,)
        Posterior probability of each pair; they sum to 1.
    log_evidence : float
        Log probability of the counts, of all pairs together.
    forward : ndarray, shape (n, rows, shape)
        Probability of level and successes needed given the counts up to each one.
    log_scale : ndarray, shape (n, pairs)
        Log of what each step's weights were divided by: of each count's probability over its largest.
    backward : ndarray, shape (n, rows, shape)
        Probability of the counts after each one given level and successes needed, in units of its own.
    log_backward : ndarray, shape (n, pairs)
        Log of that unit.
    ahead : ndarray, shape (n, rows)
        Probability of each count and all after it given that it starts a run at a level, in units of its own.
    shift : ndarray, shape (n, pairs)
        Probability that each count starts a run, given all counts; 0 for the first.
    level_mass : ndarray, shape (n, rows)
        Probability of the level at each count given all counts, all pairs together.
    one_off : ndarray, shape (n,)
        Probability that each count is a one-off, given all counts.
    """

    chain: Chain
    pair_weight: FloatArray
    log_evidence: float
    forward: FloatArray
    log_scale: FloatArray
    backward: FloatArray
    log_backward: FloatArray
    ahead: FloatArray
    shift: FloatArray
    level_mass: FloatArray
    one_off: FloatArray

    @property
    def shift_probability(self) -> FloatArray:
        """Probability that each count starts a run, given all counts, shape (n,)."""
        probability: FloatArray = self.shift @ self.pair_weight
        return probability


@dataclass(frozen=True)
class Forward:
    """One step of the forward pass."""

    weights: FloatArray
    log_scale: FloatArray
    log_unit: float


def _forward_step(chain: Chain, index: int, weights: FloatArray | None) -> Forward:
    """The weights after a count, from those after the count before it."""
    if weights is None:
        arrived = chain.first_weights()
    else:
        step = chain.phases(index)
        moved = chain.walked(index, weights)
        arrived = moved @ step.stay
        arrived[:, -1] += chain.bench.jump(moved @ step.leave)
    likelihood = chain.likelihood(index)
    arrived *= likelihood.probability[:, None]
    total = np.maximum(chain.by_pair(arrived).sum(axis=1), NO_CHANCE)
    divided = arrived / chain.bench.grid.spread(total)[:, None]
    return Forward(divided, np.log(total), float(likelihood.log_scale[0]))


def _forward(chain: Chain) -> list[Forward]:
    """The forward pass over the whole record."""
    steps = [_forward_step(chain, 0, None)]
    for index in range(1, len(chain.counts)):
        steps.append(_forward_step(chain, index, steps[-1].weights))
    return steps


def both_passes(chain: Chain) -> Passes:
    """Run a first pass over all pairs, drop those that are negligible, and run both passes over the rest.

    Parameters
    ----------
    chain : Chain
        The record with all pairs.

    Returns
    -------
    Passes
        Pairs less probable than the model's `accuracy.drop_below`, given the whole record, are left out.
    """
    chain, log_weight, log_unit = _weighed(chain)
    top = log_weight.max()
    weight = np.exp(log_weight - top)
    log_evidence = float(np.log(weight.sum()) + top + log_unit)
    weight /= weight.sum()
    kept = np.flatnonzero(weight >= min(chain.model.accuracy.drop_below, float(weight.max())))
    return _backward(chain.of_pairs(kept), weight[kept] / weight[kept].sum(), log_evidence)


def _weighed(chain: Chain) -> tuple[Chain, FloatArray, float]:
    """The pairs still in the running after the last count, the log weight of each, and its unit.

    Every so many counts the pairs that have become hopeless are left behind.
    """
    log_weight, log_unit = chain.log_prior, 0.0
    weights: FloatArray | None = None
    for index in range(len(chain.counts)):
        if index % HOPELESS_EVERY == HOPELESS_EVERY - 1 and weights is not None:
            hopeful = np.flatnonzero(log_weight >= log_weight.max() + LOG_HOPELESS)
            weights = weights[chain.bench.grid.rows_of_pairs(hopeful)]
            chain, log_weight = chain.of_pairs(hopeful), log_weight[hopeful]
        step = _forward_step(chain, index, weights)
        weights = step.weights
        log_weight, log_unit = log_weight + step.log_scale, log_unit + step.log_unit
    return chain, log_weight, log_unit


def _backward(chain: Chain, pair_weight: FloatArray, log_evidence: float) -> Passes:
    steps = _forward(chain)
    forward = np.stack([step.weights for step in steps])
    size, grid = len(steps), chain.bench.grid
    backward, ahead = np.ones_like(forward), np.zeros(forward.shape[:2])
    log_backward, shift = np.zeros((size, pair_weight.size)), np.zeros((size, pair_weight.size))
    level_mass, one_off = np.zeros(forward.shape[:2]), np.zeros(size)
    share = grid.spread(pair_weight)
    for index in reversed(range(size)):
        likelihood = chain.likelihood(index)
        mass = np.einsum("rk,rk->r", forward[index], backward[index])
        level_mass[index] = mass / grid.spread(np.maximum(chain.by_pair(mass), NO_CHANCE)) * share
        one_off[index] = min(level_mass[index] @ likelihood.one_off_share, 1.0)
        here = backward[index] * likelihood.probability[:, None]
        ahead[index] = here[:, -1]
        if index == 0:
            break
        step = chain.phases(index)
        left = chain.jump_back(here[:, -1:])
        moved = chain.walked(index, forward[index - 1])
        shifted = chain.by_pair((moved @ step.leave) * left[:, 0])
        stayed = chain.by_pair(np.einsum("rk,rk->r", moved @ step.stay, here))
        shift[index] = shifted / np.maximum(shifted + stayed, NO_CHANCE)
        before = chain.walked(index, here @ step.stay.T + left * step.leave)
        unit = np.maximum(np.maximum.reduceat(before.max(axis=1), grid.start), NO_CHANCE)
        backward[index - 1] = before / grid.spread(unit)[:, None]
        log_backward[index - 1] = log_backward[index] + np.log(unit)
    return Passes(
        chain=chain,
        pair_weight=pair_weight,
        log_evidence=log_evidence,
        forward=forward,
        log_scale=np.stack([step.log_scale for step in steps]),
        backward=backward,
        log_backward=log_backward,
        ahead=ahead,
        shift=shift,
        level_mass=level_mass,
        one_off=one_off,
    )
