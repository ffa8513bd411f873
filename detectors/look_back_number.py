"""How many shifts a record holds."""

import math

import numpy as np
from numpy.typing import NDArray

from detectors.look_back_passes import NO_WEIGHT, Passes

FloatArray = NDArray[np.float64]

EMPTY_NUMBER = 1e-14
"""A number of shifts so far that is less probable than this, given all counts, is not followed further."""


def number_of_shifts(passes: Passes) -> FloatArray:
    """Posterior of the number of shifts.

    Parameters
    ----------
    passes : Passes
        The record.

    Returns
    -------
    ndarray
        Probability of 0, 1, 2, ... shifts; they sum to 1. High numbers below 1e-14 are left out; what would
        lie more than eight standard deviations beyond the number expected is counted with the last.

    Notes
    -----
    The forward pass again, with the shifts so far as one more part of the state.
    """
    most = _most(passes)
    weights = passes.forward[0][:, :, None]
    lowest, index = 0, 0
    for index in range(1, len(passes.chain.counts)):
        weights = _step(passes, index, weights, lowest + weights.shape[2] <= most)
        held = np.flatnonzero(_by_number(passes, index, weights) > EMPTY_NUMBER)
        weights = weights[:, :, held[0] : held[-1] + 1]
        lowest += int(held[0])
    probability = np.concatenate((np.zeros(lowest), _by_number(passes, index, weights)))
    shares: FloatArray = probability / probability.sum()
    return shares


def _most(passes: Passes) -> int:
    expected = float(passes.shift_probability.sum())
    return min(len(passes.chain.counts) - 1, math.ceil(expected + 8.0 * math.sqrt(expected + 1.0) + 8.0))


def _by_number(passes: Passes, index: int, weights: FloatArray) -> FloatArray:
    """Probability of each number of shifts up to a count, given all counts."""
    by_row = np.einsum("rmc,rm->rc", weights, passes.backward[index])
    by_pair = passes.chain.by_pair(by_row)
    whole = np.maximum(by_pair.sum(axis=1), NO_WEIGHT)
    mass: FloatArray = (passes.pair_weight / whole) @ by_pair
    return mass


def _step(passes: Passes, index: int, weights: FloatArray, may_grow: bool) -> FloatArray:
    """One count further; shape (rows, shape, numbers)."""
    chain, step = passes.chain, passes.chain.phases(index)
    rows, shape, numbers = weights.shape
    moved = chain.walked(index, weights.reshape(rows, shape * numbers)).reshape(weights.shape)
    stayed = np.einsum("rmc,mn->rnc", moved, step.stay)
    arrived = chain.jump(np.einsum("rmc,m->rc", moved, step.leave))
    after = np.zeros((rows, shape, numbers + 1))
    after[:, :, :numbers] = stayed
    after[:, -1, 1:] += arrived
    if not may_grow:
        after[:, :, numbers - 1] += after[:, :, numbers]
        after = after[:, :, :numbers]
    scale = passes.probability[index] / chain.bench.grid.spread(np.exp(passes.log_scale[index]))
    after *= scale[:, None, None]
    return after
