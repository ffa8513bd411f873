"""Carrying weights from one level grid to another."""

import numpy as np
from numpy.typing import NDArray

from detectors.level_grid import LevelGrid

FloatArray = NDArray[np.float64]
Weights = NDArray[np.floating]

FLOOR = 1e-7
"""Height of the broad part of the reference curve, beside a peak of 1."""


def extended(weights: Weights, old: LevelGrid, new: LevelGrid) -> Weights:
    """Weights on grids of the same spacing but another range; nodes outside the old range are empty.

    Parameters
    ----------
    weights : ndarray, shape (old.rows, slots)
        Weights on the old grids.
    old, new : LevelGrid
        The same pairs in the same order, with the same spacing.

    Returns
    -------
    ndarray, shape (new.rows, slots)
    """
    result = np.zeros((new.rows, weights.shape[1]), dtype=weights.dtype)
    shared_first = np.maximum(old.first, new.first)
    shared_last = np.minimum(old.first + old.size, new.first + new.size)
    for pair in range(old.size.size):
        count = int(shared_last[pair] - shared_first[pair])
        if count > 0:
            source = int(old.start[pair] + shared_first[pair] - old.first[pair])
            target = int(new.start[pair] + shared_first[pair] - new.first[pair])
            result[target : target + count] = weights[source : source + count]
    return result


def respaced(block: Weights, old_level: FloatArray, new_level: FloatArray) -> Weights:
    """One pair's weights interpolated to another spacing.

    Each run's weights are divided by a reference curve (the Gaussian with the weights' mean and variance,
    plus a low broad part), the smooth ratio is interpolated with cubic polynomials, and the curve is put
    back: neither the narrow peak of an old run nor the hole that the jump prior leaves is smeared. Each run's
    total is kept exactly.

    Parameters
    ----------
    block : ndarray, shape (old nodes, slots)
        Weights on the old nodes.
    old_level, new_level : ndarray, shape (old nodes,) and (new nodes,)
        Log levels, equally spaced and ascending.

    Returns
    -------
    ndarray, shape (new nodes, slots)
    """
    values = block.astype(np.float64)
    totals = values.sum(axis=0)
    safe = np.where(totals > 0.0, totals, 1.0)
    mean = old_level @ values / safe
    spacing = old_level[1] - old_level[0]
    variance = np.maximum((old_level**2) @ values / safe - mean**2, spacing**2 / 4.0)
    ratio = values / _reference(old_level, mean, variance)
    interpolated = _cubic(ratio, (new_level - old_level[0]) / spacing)
    result = np.maximum(interpolated * _reference(new_level, mean, variance), 0.0)
    reached = result.sum(axis=0)
    return (result * np.where(reached > 0.0, totals / np.where(reached > 0.0, reached, 1.0), 0.0)).astype(
        block.dtype
    )


def _reference(level: FloatArray, mean: FloatArray, variance: FloatArray) -> FloatArray:
    return np.exp(-0.5 * (level[:, None] - mean) ** 2 / variance) + FLOOR


def _cubic(values: FloatArray, place: FloatArray) -> FloatArray:
    """Four-point Lagrange interpolation along the first axis; zero outside."""
    padded = np.pad(values, ((2, 2), (0, 0)))
    inside = (place >= -1.0) & (place <= values.shape[0])
    base = np.clip(np.floor(place).astype(np.int64), -1, values.shape[0] - 1)
    t = (place - base)[:, None]
    base = base + 2
    nodes = [padded[base + step] for step in (-1, 0, 1, 2)] if values.shape[0] else []
    weights = (
        -t * (t - 1) * (t - 2) / 6,
        (t + 1) * (t - 1) * (t - 2) / 2,
        -(t + 1) * t * (t - 2) / 2,
        (t + 1) * t * (t - 1) / 6,
    )
    return sum(w * v for w, v in zip(weights, nodes, strict=True)) * inside[:, None]  # type: ignore[no-any-return]
