"""Several streams folded in one call: simulations fold hundreds, all with the same positions."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from detectors.bench import bench_for
from detectors.errors import UnusableParameter
from detectors.filter_state import FilterState
from detectors.level_grid import LevelGrid
from detectors.recent_runs import joined_recent

FloatArray = NDArray[np.float64]


def joined(states: Sequence[FilterState]) -> FilterState:
    """Put streams side by side; `run_length.next_count` then folds one count of each in one call.

    Parameters
    ----------
    states : sequence of FilterState
        States of streams with the same model and the same positions, past their early counts.

    Returns
    -------
    FilterState
        One state with as many streams, in the order given.

    Raises
    ------
    UnusableParameter
        If the states differ in model, positions or number of counts, or are still early.
    """
    first = states[0]
    same = all(_like(first, other) for other in states[1:])
    if not same or any(state.early for state in states):
        raise UnusableParameter(
            "states", len(states), "streams of one model, at one position, past early counts"
        )
    benches = [state.bench for state in states]
    grid = LevelGrid(
        *(np.concatenate([getattr(b.grid, name) for b in benches]) for name in ("spacing", "first", "size"))
    )
    pairs = np.array([b.dispersion.size for b in benches])
    bench = bench_for(
        first.bench.model,
        np.concatenate([b.dispersion for b in benches]),
        np.concatenate([b.wander for b in benches]),
        np.concatenate(([0], np.cumsum(pairs)[:-1])),
        grid,
    )
    return FilterState(
        bench=bench,
        counted=first.counted,
        position=first.position,
        log_weight=np.concatenate([state.log_weight for state in states]),
        weights=np.concatenate([_plain(state) for state in states]),
        run_factor=np.where(first.slots.used, 1.0, 0.0),
        pair_total=np.concatenate([state.pair_total for state in states]),
        slots=first.slots,
        reference=np.concatenate([state.reference for state in states]),
        recent=joined_recent([state.recent for state in states]),
        early=(),
    )


def _like(first: FilterState, other: FilterState) -> bool:
    same_slots = np.array_equal(first.slots.newest, other.slots.newest) and np.array_equal(
        first.slots.start_position, other.slots.start_position
    )
    return (first.bench.model, first.counted, first.position) == (
        other.bench.model,
        other.counted,
        other.position,
    ) and same_slots


def _plain(state: FilterState) -> NDArray[np.floating]:
    """The weights with each run's factor multiplied in."""
    return state.weights * state.run_factor.astype(state.weights.dtype)
