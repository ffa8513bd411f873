"""What the filter expected of a count, against sums of its own predictive probabilities, count by count.

Only what the filter says in public is used: a checkpoint is taken on with every count in turn, and the
probabilities that it gave them are added up.
"""

import math

import numpy as np
import pytest
from scipy import stats

from detectors.advance import Checkpoint, advance, start
from detectors.judge import Rule
from detectors.model import Model
from detectors.observation import Observation

# One-offs with a light tail, so that the sum ends.
MODEL = Model(one_off_tail=4.0, dispersions=(1.0, 6.0, 40.0, math.inf), wanders=((0.0, 1.0), (0.1, 0.3)))


def seen(level: float, dispersion: float, size: int) -> Checkpoint:
    rng = np.random.default_rng([size, int(level)])
    counts = rng.poisson(level * rng.gamma(dispersion, 1.0 / dispersion, size)).tolist()
    return advance(start(MODEL), [Observation(i, x) for i, x in enumerate(counts)], Rule()).checkpoint


def expected_of(checkpoint: Checkpoint, position: int, count: int) -> tuple[float, tuple[float, float]]:
    (posterior,) = advance(checkpoint, [Observation(position, count)], Rule()).posteriors
    assert posterior is not None
    return math.exp(posterior.log_predictive), posterior.pit


@pytest.mark.parametrize("size", [26, 45, 120])
@pytest.mark.parametrize(("level", "dispersion"), [(4.0, 50.0), (4.0, 2.0)])
def test_predictive_probabilities_sum_to_one(level: float, dispersion: float, size: int) -> None:
    # Each count may ask for another grid, and a jump beyond their ends is left out: not exactly 1.
    checkpoint = seen(level, dispersion, size)
    total = math.fsum(expected_of(checkpoint, size, count)[0] for count in range(250))
    assert total == pytest.approx(1.0, abs=2e-3)


@pytest.mark.parametrize("size", [26, 45, 120])
@pytest.mark.parametrize(("level", "dispersion"), [(4.0, 50.0), (30.0, 8.0)])
def test_transform_is_the_running_sum(level: float, dispersion: float, size: int) -> None:
    checkpoint, running = seen(level, dispersion, size), 0.0
    for count in range(int(2.5 * level)):
        probability, (below, up_to) = expected_of(checkpoint, size, count)
        assert below == pytest.approx(running, abs=3e-3)
        running += probability
        assert up_to == pytest.approx(running, abs=3e-3)
    assert running > 0.9


@pytest.mark.parametrize("count", [0, 1, 3, 8, 30])
def test_step_of_the_transform_is_the_predictive_probability(count: int) -> None:
    # For a single known dispersion and no wander the step of the transform is the predictive probability.
    model = Model(dispersions=(5.0,), wanders=((0.0, 1.0),))
    checkpoint = advance(start(model), [Observation(i, 8) for i in range(40)], Rule()).checkpoint
    probability, (below, up_to) = expected_of(checkpoint, 40, count)
    assert up_to - below == pytest.approx(probability, abs=1e-4)


def test_transform_of_a_well_known_stream_is_that_of_its_law() -> None:
    # After 300 counts of a Poisson stream the predictive is the Poisson law up to the level's own error
    # (1 % here) and the share of one-offs, 2 %.
    level = 60.0
    model = Model(dispersions=(math.inf,), wanders=((0.0, 1.0),))
    counts = np.random.default_rng(9).poisson(level, 300).tolist()
    checkpoint = advance(start(model), [Observation(i, x) for i, x in enumerate(counts)], Rule()).checkpoint
    mean = float(np.mean(counts))
    for count in (45, 55, 60, 66, 75):
        _, (below, up_to) = expected_of(checkpoint, 300, count)
        assert below == pytest.approx(stats.poisson.cdf(count - 1, mean), abs=0.03)
        assert up_to == pytest.approx(stats.poisson.cdf(count, mean), abs=0.03)
