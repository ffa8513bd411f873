"""Streams folded in one call say what they say alone."""

import numpy as np
import pytest

from detectors.advance import advance, start
from detectors.errors import UnusableParameter
from detectors.judge import Rule
from detectors.model import Model
from detectors.run_length import next_count
from detectors.side_by_side import joined
from detectors.simulation import OneOffs, as_observations, simulate, stepped

BEGUN, COUNTS = 30, 60
NEVER_RINGS = Rule(threshold=1.0 - 1e-12)


def series(level: float, dispersion: float, factor: float, seed: int):
    levels = stepped(level, BEGUN + COUNTS, change_at=50, factor=factor)
    return as_observations(simulate(levels, dispersion, OneOffs(share=0.03), np.random.default_rng(seed)))


def test_the_same_as_one_by_one():
    streams = [series(12.0, 3.0, 0.5, 1), series(900.0, 20.0, 1.6, 2), series(40_000.0, 200.0, 1.0, 3)]
    model = Model()
    states = [advance(start(model), stream[:BEGUN], NEVER_RINGS).checkpoint.state for stream in streams]
    together = joined(states)
    for place in range(BEGUN, BEGUN + COUNTS):
        together, step = next_count(together, tuple(stream[place] for stream in streams))
        for index, stream in enumerate(streams):
            states[index], alone = next_count(states[index], (stream[place],))
            np.testing.assert_array_equal(alone.slots.newest, step.slots.newest)
            np.testing.assert_allclose(step.run_mass[index], alone.run_mass[0], atol=5e-5)
            assert step.log_predictive[index] == pytest.approx(alone.log_predictive[0], abs=1e-3)


def test_streams_that_do_not_match_are_refused():
    model, stream = Model(), series(12.0, 3.0, 0.5, 1)
    shorter = advance(start(model), stream[: BEGUN - 1], NEVER_RINGS).checkpoint.state
    longer = advance(start(model), stream[:BEGUN], NEVER_RINGS).checkpoint.state
    with pytest.raises(UnusableParameter):
        joined([shorter, longer])
    early = advance(start(model), stream[:5], NEVER_RINGS).checkpoint.state
    with pytest.raises(UnusableParameter):
        joined([early, early])
