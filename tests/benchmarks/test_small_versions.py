"""Small versions of what `deploy/prove` measures at length, and the bookkeeping behind it."""

import accuracy
import alarms
import detection
import numpy as np
import pytest
import speed

from detectors.advance import advance, start
from detectors.judge import Rule
from detectors.model import Model
from detectors.simulation import OneOffs, as_observations, simulate, stepped


@pytest.mark.parametrize("threshold", [0.3, 0.7, 0.95])
def test_alarms_afterwards_are_the_judges_own(threshold):
    """The benchmarks judge recorded posteriors at many thresholds; the judge itself must agree at each."""
    random = np.random.default_rng(11)
    levels = stepped(200.0, 110, change_at=60, factor=0.4)
    counts = simulate(levels, 8.0, OneOffs(share=0.03), random)
    rule = Rule(threshold=threshold)
    told = advance(start(Model()), as_observations(counts), rule).announcements
    recorded = alarms.record(Model(), [counts], rule.window)[0]
    assert alarms.alarms(recorded, rule) == [one.position for one in told]
    assert told or threshold == 0.95


def test_shortcuts_cost_little():
    """The full protocol asks for 0.002 over 50 streams of 600 counts; `deploy/prove` prints it."""
    found = accuracy.measure(4, 200, ("grid four times finer", "nothing merged"))
    assert found["grid four times finer"].max() <= 0.003
    assert found["nothing merged"].max() <= 0.002


def test_falls_are_found_and_flat_streams_left_alone():
    """Far below the full protocol's size, so only what cannot be luck is asserted."""
    rule = Rule(threshold=0.7)
    flat = alarms.record(
        Model(), [detection.counts_of("flat", s, detection.ONE_OFFS)[:300] for s in range(6)], 40
    )
    fallen = alarms.record(
        Model(), [detection.counts_of("100", s, detection.ONE_OFFS) for s in range(16)], 40
    )
    assert sum(len(alarms.alarms(one, rule)) for one in flat) <= 5
    hits = sum(any(100 <= place < 120 for place in alarms.alarms(one, rule)) for one in fallen)
    assert hits >= 11


def test_cost_is_measured_and_bounded():
    """Generous here, because a shared machine may interrupt; `deploy/prove` prints the medians."""
    rows = speed.one_stream(10_000.0, 10.0, 1, 200)
    assert [size for size, *_ in rows] == [30, 100, 200]
    assert all(0.0 < ratio < 200.0 for _, ratio, _, _ in rows)
    assert all(checkpoint <= 400_000 and stored <= 1000 for _, _, checkpoint, stored in rows)
