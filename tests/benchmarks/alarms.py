"""The judge's rule applied afterwards, at any threshold, to recorded run-length posteriors of simulated streams.

A filter's posterior does not depend on the threshold, so each stream is folded once and judged many times.
`tests/benchmarks/test_small_versions.py` holds this against the judge itself.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from detectors.judge import Rule
from detectors.model import Model
from detectors.run_length import first_count, next_count
from detectors.side_by_side import joined
from detectors.simulation import as_observations

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Recorded:
    """Probability of each run length from 1 to the longest, at each count; the first run left out."""

    by_length: NDArray[np.float32]


def record(model: Model, streams, longest: int) -> list[Recorded]:
    """Fold streams of one length, side by side once their counts are no longer few, and keep what the judge sees."""
    observations = [as_observations(counts) for counts in streams]
    kept = [np.zeros((len(counts), longest), np.float32) for counts in streams]
    begun = min(model.accuracy.early + 1, len(observations[0]))
    states = [_early(model, stream[:begun], into) for stream, into in zip(observations, kept, strict=True)]
    if begun < len(observations[0]):
        state = joined(states)
        for place in range(begun, len(observations[0])):
            state, step = next_count(state, tuple(stream[place] for stream in observations))
            _keep(state, step, [into[place] for into in kept])
    return [Recorded(by_length) for by_length in kept]


def _early(model: Model, observations, into: NDArray[np.float32]):
    state, _ = first_count(model, (observations[0],))
    for place, observation in enumerate(observations[1:], start=1):
        state, step = next_count(state, (observation,))
        _keep(state, step, [into[place]])
    return state


def _keep(state, step, rows: list[NDArray[np.float32]]) -> None:
    length = state.counted - step.slots.newest + 1
    recent = np.flatnonzero(step.slots.used & (length <= rows[0].size))
    recent = recent[recent > 0]
    for stream, row in enumerate(rows):
        row[length[recent] - 1] = step.run_mass[stream, recent]


def alarms(recorded: Recorded, rule: Rule) -> list[int]:
    """Places (0-based) at which the judge rings."""
    last, rung = 0, []
    running = np.cumsum(recorded.by_length.astype(np.float64), axis=1)
    for place in range(len(running)):
        counted = place + 1
        longest = min(rule.window, counted - last)
        if counted < rule.fewest_counts or longest < rule.lasting:
            continue
        below = running[place, rule.lasting - 2] if rule.lasting > 1 else 0.0
        if running[place, longest - 1] - below >= rule.threshold:
            rung.append(place)
            last = counted
    return rung


def threshold_for(streams: list[Recorded], rule: Rule, per_count: float) -> float:
    """The lowest threshold at which unchanged streams alarm at most so often a count."""
    low, high = -6.0, 16.0
    total = sum(len(stream.by_length) for stream in streams)
    for _ in range(40):
        middle = (low + high) / 2
        ringing = sum(len(alarms(stream, at_odds(rule, middle))) for stream in streams)
        low, high = (middle, high) if ringing > per_count * total else (low, middle)
    return at_odds(rule, high).threshold


def at_odds(rule: Rule, log_odds: float) -> Rule:
    """The same rule with another threshold."""
    threshold = min(1.0 / (1.0 + np.exp(-log_odds)), 1.0 - 1e-12)
    return Rule(float(threshold), rule.window, rule.lasting, rule.fewest_counts)
