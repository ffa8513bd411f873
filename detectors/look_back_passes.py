"""The forward and the backward pass over a whole record."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from detectors.bench import Likelihood
from detectors.look_back_chain import Chain

FloatArray = NDArray[np.float64]

NO_WEIGHT = 1e-290
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
    probability : ndarray, shape (n, rows)
        Probability of each count at each node, in units of its largest.
    forward : ndarray, shape (n, rows, shape)
        Probability of level and successes needed given the counts up to each one.
    log_scale : ndarray, shape (n, pairs)
        Log of what each step's weights were divided by: of each count's probability over its largest.
    backward : ndarray, shape (n, rows, shape)
        Probability of the counts after each one given level and successes needed, in units of its own.
    log_backward : ndarray, shape (n, pairs)
        Log of that unit.
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
    probability: FloatArray
    forward: FloatArray
    log_scale: FloatArray
    backward: FloatArray
    log_backward: FloatArray
    shift: FloatArray
    level_mass: FloatArray
    one_off: FloatArray

    def ahead(self, index: int) -> FloatArray:
        """Probability of a count and all after it given that it starts a run at a level, shape (rows,)."""
        likely: FloatArray = self.backward[index, :, -1] * self.probability[index]
        return likely

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


def _forward_step(chain: Chain, index: int, likelihood: Likelihood, weights: FloatArray | None) -> Forward:
    """The weights after a count, from those after the count before it."""
    if weights is None:
        arrived = chain.first_weights()
    else:
        step = chain.phases(index)
        moved = chain.walked(index, weights)
        arrived = moved @ step.stay
        arrived[:, -1] += chain.bench.jump(moved @ step.leave)
    arrived *= likelihood.probability[:, None]
    total = np.maximum(chain.by_pair(arrived).sum(axis=1), NO_WEIGHT)
    divided = arrived / chain.bench.grid.spread(total)[:, None]
    return Forward(divided, np.log(total), float(likelihood.log_scale[0]))


def _forward(chain: Chain, likelihoods: Sequence[Likelihood]) -> list[Forward]:
    """The forward pass over the whole record."""
    steps: list[Forward] = []
    for index, likelihood in enumerate(likelihoods):
        steps.append(_forward_step(chain, index, likelihood, steps[-1].weights if steps else None))
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
        step = _forward_step(chain, index, chain.likelihood(index), weights)
        weights = step.weights
        log_weight, log_unit = log_weight + step.log_scale, log_unit + step.log_unit
    return chain, log_weight, log_unit


@dataclass(frozen=True)
class _Backward:
    """One step of the backward pass: weights and their log unit at the count before, chance of a shift."""

    weights: FloatArray
    log_unit: FloatArray
    shift: FloatArray


def _backward_step(
    chain: Chain, index: int, before: FloatArray, after: FloatArray, probability: FloatArray
) -> _Backward:
    """From a count to the one before it, given the forward weights there and the backward weights here."""
    step, starts = chain.phases(index), chain.bench.grid.start
    here = after * probability[:, None]
    arriving = chain.jump_back(here[:, -1:])
    moved = chain.walked(index, before)
    shifted = np.maximum(chain.by_pair((moved @ step.leave) * arriving[:, 0]), 0.0)
    stayed = np.maximum(chain.by_pair(np.einsum("rk,rk->r", moved @ step.stay, here)), 0.0)
    weights = chain.walked(index, here @ step.stay.T + arriving * step.leave)
    unit = np.maximum(np.maximum.reduceat(weights.max(axis=1), starts), NO_WEIGHT)
    return _Backward(
        weights=weights / chain.bench.grid.spread(unit)[:, None],
        log_unit=np.log(unit),
        shift=shifted / np.maximum(shifted + stayed, NO_WEIGHT),
    )


def _backward(chain: Chain, pair_weight: FloatArray, log_evidence: float) -> Passes:
    likelihoods = [chain.likelihood(index) for index in range(len(chain.counts))]
    probability = np.stack([one.probability for one in likelihoods])
    steps = _forward(chain, likelihoods)
    forward = np.stack([step.weights for step in steps])
    backward, size = np.ones_like(forward), len(steps)
    log_backward, shift = np.zeros((size, pair_weight.size)), np.zeros((size, pair_weight.size))
    for index in reversed(range(1, size)):
        step = _backward_step(chain, index, forward[index - 1], backward[index], probability[index])
        backward[index - 1], shift[index] = step.weights, step.shift
        log_backward[index - 1] = log_backward[index] + step.log_unit
    level_mass = _level_mass(chain, pair_weight, forward, backward)
    one_off = [mass @ one.one_off_share for mass, one in zip(level_mass, likelihoods, strict=True)]
    return Passes(
        chain=chain,
        pair_weight=pair_weight,
        log_evidence=log_evidence,
        probability=probability,
        forward=forward,
        log_scale=np.stack([step.log_scale for step in steps]),
        backward=backward,
        log_backward=log_backward,
        shift=shift,
        level_mass=level_mass,
        one_off=np.clip(one_off, 0.0, 1.0),
    )


def _level_mass(
    chain: Chain, pair_weight: FloatArray, forward: FloatArray, backward: FloatArray
) -> FloatArray:
    mass = np.maximum(np.einsum("nrk,nrk->nr", forward, backward), 0.0)
    whole = np.add.reduceat(mass, chain.bench.grid.start, axis=1)
    share = pair_weight / np.maximum(whole, NO_WEIGHT)
    of_all: FloatArray = mass * np.repeat(share, chain.bench.grid.size, axis=1)
    return of_all
