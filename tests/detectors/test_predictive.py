"""What the filter expected of a count, against sums over the same weights done by scipy."""

import math

import numpy as np
import pytest
from scipy import stats

from detectors.advance import Checkpoint, advance, start
from detectors.bench import Bench
from detectors.filter_state import Step
from detectors.judge import Rule
from detectors.model import Model
from detectors.observation import Observation
from detectors.predictive import transform
from detectors.run_length import first_count, next_count

PROMISED = 1e-3


def summed(bench: Bench, step: Step, observation: Observation) -> tuple[float, float]:
    """F(x - 1) and F(x): every node's own distribution function, weighted by its weight before the count."""
    assert observation.count is not None
    weight = step.row_mass / step.likelihood.probability
    weight = weight / weight.sum()
    mean, size = bench.level * observation.exposure, bench.row_dispersion
    if observation.relative_sd > 0.0:
        c = observation.relative_sd
        size = 1.0 / (1.0 / size + c**2 + c**2 / size)
    share, tail = bench.model.one_off_share, bench.model.one_off_tail

    def at(count: int) -> float:
        if count < 0:
            return 0.0
        finite = np.where(np.isinf(size), 1.0, size)
        ordinary = np.where(
            np.isinf(size), stats.poisson.cdf(count, mean), stats.nbinom.cdf(count, finite, finite / (finite + mean))
        )
        broad = 1.0 / (1.0 + (mean / (count + 0.5)) ** tail)
        return float(weight @ ((1.0 - share) * ordinary + share * broad))

    return at(observation.count - 1), at(observation.count)


def largest_error(model: Model, observations: list[Observation]) -> float:
    state, step = first_count(model, observations[0])
    worst = 0.0
    for place, observation in enumerate(observations):
        if place:
            state, step = next_count(state, observation)
        got = transform(state.bench, step, observation)
        worst = max(worst, *np.abs(np.subtract(got, summed(state.bench, step, observation))))
    return float(worst)


def counts(level: float, dispersion: float, size: int, seed: int) -> list[Observation]:
    rng = np.random.default_rng([seed, int(level)])
    drawn = rng.poisson(level * rng.gamma(dispersion, 1.0 / dispersion, size)).tolist()
    drawn[size // 2] *= 20
    return [Observation(i, x) for i, x in enumerate(drawn)]


@pytest.mark.parametrize("dispersion", [2.0, 11.0, 300.0])
@pytest.mark.parametrize("level", [3.0, 60.0, 5_000.0])
def test_transform_against_direct_sums(level: float, dispersion: float) -> None:
    # Young streams and older ones: the first count, the early phase, and grids that have been laid anew.
    assert largest_error(Model(), counts(level, dispersion, 70, seed=1)) <= PROMISED


def test_transform_with_exposure_and_its_uncertainty() -> None:
    rng = np.random.default_rng(2)
    observations = [
        Observation(o.position, o.count, float(rng.choice([0.2, 1.0, 3.0])), float(rng.choice([0.0, 0.3, 2.0])))
        for o in counts(200.0, 9.0, 60, seed=2)
    ]
    assert largest_error(Model(one_off_tail=0.7), observations) <= PROMISED


def test_transform_is_what_is_stored() -> None:
    observations = counts(90.0, 6.0, 12, seed=3)
    state, step = first_count(Model(), observations[0])
    stored = advance(start(Model()), observations, Rule()).posteriors
    for place, observation in enumerate(observations):
        if place:
            state, step = next_count(state, observation)
        posterior = stored[place]
        assert posterior is not None
        assert posterior.pit == transform(state.bench, step, observation)


@pytest.fixture(scope="module")
def settled() -> Checkpoint:
    """A stream at a level of about 4, with one-offs whose tail is light enough to be summed."""
    model = Model(one_off_tail=4.0, dispersions=(1.0, 6.0, math.inf), wanders=((0.0, 1.0), (0.1, 0.3)))
    drawn = np.random.default_rng(4).poisson(4.0, 45).tolist()
    return advance(start(model), [Observation(i, x) for i, x in enumerate(drawn)], Rule()).checkpoint


def predicted(checkpoint: Checkpoint, count: int) -> tuple[float, tuple[float, float]]:
    (posterior,) = advance(checkpoint, [Observation(45, count)], Rule()).posteriors
    assert posterior is not None
    return math.exp(posterior.log_predictive), posterior.pit


def test_predictive_probabilities_sum_to_one(settled: Checkpoint) -> None:
    # The jump prior's mass beyond the ends of the grid, at levels that no count below asks for, is left out.
    total = math.fsum(predicted(settled, count)[0] for count in range(400))
    assert total == pytest.approx(1.0, abs=2e-3)
    assert total <= 1.0 + 1e-6


def test_transform_is_the_running_sum_of_the_predictive(settled: Checkpoint) -> None:
    running = 0.0
    for count in range(25):
        probability, (below, up_to) = predicted(settled, count)
        assert below == pytest.approx(running, abs=2e-3)
        running += probability
        assert up_to == pytest.approx(running, abs=2e-3)
