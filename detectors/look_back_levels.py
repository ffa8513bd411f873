"""The level before and after a shift, taken together."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import signal

from detectors.jump_prior import IndependentLevels
from detectors.jump_step import jump_weights
from detectors.level_grid import LevelGrid
from detectors.look_back_passes import NO_WEIGHT, Passes
from detectors.posterior import Quantiles
from detectors.quantiles import level_quantiles

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Effect:
    """The levels on both sides of a shift, given all counts and that there is one.

    Attributes
    ----------
    level_before : Quantiles
        The level that the last run had reached when the shift came.
    level_after : Quantiles
        The level at the first count of the new run.
    effect : Quantiles
        Quantiles of level after / level before, from the joint posterior of both.
    """

    level_before: Quantiles
    level_after: Quantiles
    effect: Quantiles


def effect_at(passes: Passes, dates: Sequence[int]) -> Effect:
    """The levels on both sides of a shift that lies at one of some dates.

    Parameters
    ----------
    passes : Passes
        The record.
    dates : sequence of int
        Counts that may have begun the new level, each at least 1.

    Returns
    -------
    Effect
        Each date weighs as much as its shift probability.
    """
    grid = passes.chain.bench.grid
    before, after = np.zeros(grid.rows), np.zeros(grid.rows)
    ratios = LevelGrid(grid.spacing, 1 - grid.size, 2 * grid.size - 1)
    ratio = np.zeros(ratios.rows)
    where = np.array(dates)
    leaving = np.stack([_leaving(passes, index) for index in dates])
    arriving = np.stack([passes.ahead(index) for index in dates])
    for pair in range(grid.size.size):
        rows = slice(int(grid.start[pair]), int(grid.start[pair] + grid.size[pair]))
        into = slice(int(ratios.start[pair]), int(ratios.start[pair] + ratios.size[pair]))
        weight = passes.shift[where, pair] * passes.pair_weight[pair]
        sources, targets = _joint(passes, pair, leaving[:, rows], arriving[:, rows])
        before[rows] = weight @ _shares(leaving[:, rows] * sources)
        after[rows] = weight @ _shares(arriving[:, rows] * targets)
        ratio[into] = weight @ _shares(_ratios(passes, pair, leaving[:, rows], arriving[:, rows]))
    return Effect(level_quantiles(grid, before), level_quantiles(grid, after), level_quantiles(ratios, ratio))


def _leaving(passes: Passes, index: int) -> FloatArray:
    """Weight of each level just before a shift at a count, given the counts before it, shape (rows,)."""
    chain = passes.chain
    moved: FloatArray = chain.walked(index, passes.forward[index - 1]) @ chain.phases(index).leave
    return moved


def _shares(weights: FloatArray) -> FloatArray:
    """Each row divided by its sum."""
    shares: FloatArray = weights / np.maximum(weights.sum(axis=1, keepdims=True), NO_WEIGHT)
    return shares


def _jump(passes: Passes, pair: int) -> FloatArray:
    """Probability of a jump by -(size - 1), ..., size - 1 nodes; 1 where levels are drawn afresh."""
    jump, grid = passes.chain.model.jump, passes.chain.bench.grid
    size = int(grid.size[pair])
    if isinstance(jump, IndependentLevels):
        return np.ones(2 * size - 1)
    upwards = jump_weights(jump, float(grid.spacing[pair]), size)
    return np.concatenate((upwards[:0:-1], upwards))


def _fresh(passes: Passes, pair: int) -> FloatArray:
    """What a new level weighs beforehand where it is drawn afresh, at each node of a pair; else 1."""
    jump, grid = passes.chain.model.jump, passes.chain.bench.grid
    rows = slice(int(grid.start[pair]), int(grid.start[pair] + grid.size[pair]))
    if isinstance(jump, IndependentLevels):
        return jump.density(grid.log_level[rows])
    return np.ones(int(grid.size[pair]))


def _joint(
    passes: Passes, pair: int, leaving: FloatArray, arriving: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """What each level before meets after the shift, and each level after met before it."""
    jump, fresh = _jump(passes, pair), _fresh(passes, pair)
    size = leaving.shape[1]
    kept = slice(size - 1, 2 * size - 1)
    met = _convolved(arriving * fresh, jump)[:, kept]
    came = _convolved(leaving, jump)[:, kept] * fresh
    return met, came


def _ratios(passes: Passes, pair: int, leaving: FloatArray, arriving: FloatArray) -> FloatArray:
    """Weight of each difference of the log levels, in nodes from -(size - 1) to size - 1."""
    matched = _convolved(arriving * _fresh(passes, pair), leaving[:, ::-1])
    return matched * _jump(passes, pair)


def _convolved(weights: FloatArray, other: FloatArray) -> FloatArray:
    """Convolution along the last axis, without the traces below zero that the transform leaves."""
    shaped = np.broadcast_to(other, (weights.shape[0], other.shape[-1]))
    moved: FloatArray = np.maximum(signal.fftconvolve(weights, shaped, axes=1), 0.0)
    return moved
