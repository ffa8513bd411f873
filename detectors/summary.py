"""From the filter's weights to the figures that are stored and shown."""

import numpy as np
from numpy.typing import NDArray

from detectors.filter_state import FilterState, Step
from detectors.observation import Observation
from detectors.posterior import Posterior, RunLengths, Weighted
from detectors.predictive import transform

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


def run_lengths(step: Step, counted: int) -> RunLengths:
    """The run-length posterior as groups, shortest first."""
    used = np.flatnonzero(step.slots.used)
    order = used[np.argsort(-step.slots.newest[used], kind="stable")]
    mass = step.run_mass[0, order]
    return RunLengths(
        shortest=tuple((counted - step.slots.newest[order] + 1).tolist()),
        longest=tuple((counted - step.slots.oldest[order] + 1).tolist()),
        probability=tuple((mass / mass.sum()).tolist()),
        holds_first_run=True,
    )


def most_probable(lengths: RunLengths) -> int:
    """The most probable run length; of a group of lengths, the one in its middle."""
    shortest, longest = np.array(lengths.shortest), np.array(lengths.longest)
    best = int(np.argmax(np.array(lengths.probability) / (longest - shortest + 1)))
    return int(shortest[best] + longest[best]) // 2


def posterior(state: FilterState, step: Step, observation: Observation, recent_shift: float) -> Posterior:
    """Everything that is said after a count.

    Parameters
    ----------
    state : FilterState
        The state after the count.
    step : Step
        What the count did.
    observation : Observation
        The count.
    recent_shift : float
        The judge's recent shift probability.

    Returns
    -------
    Posterior
    """
    bench = state.bench
    lengths = run_lengths(step, state.counted)
    weight = np.exp(state.log_weight)
    return Posterior(
        position=observation.position,
        counted=state.counted,
        run_lengths=lengths,
        run_length_mode=most_probable(lengths),
        recent_shift=recent_shift,
        level=step.level,
        dispersion=_marginal(bench.dispersions, weight),
        wander=_marginal(bench.wanders, weight),
        one_off=min(max(float(step.row_mass @ step.likelihood.one_off_share), 0.0), 1.0),
        log_predictive=float(step.log_predictive[0]),
        pit=transform(bench, step, observation),
    )


def _marginal(grouped: tuple[FloatArray, IntArray], weight: FloatArray) -> Weighted:
    values, group = grouped
    probability = np.bincount(group, weights=weight)
    return Weighted(tuple(values.tolist()), tuple((probability / probability.sum()).tolist()))
