"""The filter against the sum over all segmentations and all grid nodes, written out."""

import itertools
import math

import numpy as np
import pytest
from scipy import stats

from detectors.accuracy import Accuracy
from detectors.advance import advance, start
from detectors.gap_prior import GapPrior
from detectors.judge import Rule
from detectors.jump_prior import JumpPrior
from detectors.model import Model
from detectors.observation import Observation
from detectors.wander_kernel import kernel

UNMERGED = Accuracy(merging=math.inf, drop_below=0.0, crop_below=0.0, early=1000)


def gap_pmf(gap, t):
    return (
        math.comb(t - 1, gap.shape - 1) * gap.p**gap.shape * (1 - gap.p) ** (t - gap.shape)
        if t >= gap.shape
        else 0.0
    )


def gap_survival(gap, a):
    return 1.0 - math.fsum(gap_pmf(gap, t) for t in range(1, a + 1))


def first_survival(gap, a):
    """P(R > a) = sum over g >= a of S(g), divided by the mean."""
    return 1.0 - math.fsum(gap_survival(gap, g) for g in range(a)) / gap.mean


def run_end(survival, born, before, now):
    """P(a run born at `born`, alive at `before`, ends by `now`), unconditionally."""
    return survival(before - born) - survival(now - born)


def segmentation_prior(gap, positions, starts, first_run):
    """Prior probability of runs that start at the given indices (0 first), the last one still alive."""
    total = 1.0
    for run, begin in enumerate(starts):
        equilibrium = run == 0 and first_run == "equilibrium"
        survival = (lambda a: first_survival(gap, a)) if equilibrium else (lambda a: gap_survival(gap, a))
        born = positions[begin]
        if run + 1 < len(starts):
            end = starts[run + 1]
            total *= run_end(survival, born, positions[end - 1], positions[end])
        else:
            total *= survival(positions[-1] - born)
    return total


def count_probability(model, observation, mean, dispersion):
    c = observation.relative_sd
    if math.isinf(dispersion) and c == 0:
        nb = stats.poisson.pmf(observation.count, mean)
    else:
        effective = 1.0 / (1.0 / dispersion + c**2 + c**2 / dispersion)
        nb = stats.nbinom.pmf(observation.count, effective, effective / (effective + mean))
    upper = np.array([1.0 / (1.0 + (m / (observation.count + 0.5)) ** model.one_off_tail) for m in mean])
    if observation.count == 0:
        lower = np.zeros_like(mean)
    else:
        lower = np.array([1.0 / (1.0 + (m / (observation.count - 0.5)) ** model.one_off_tail) for m in mean])
    return (1 - model.one_off_share) * nb + model.one_off_share * (upper - lower)


def dense_walk(size, step):
    weights = kernel(round(step, 12))
    distance = np.abs(np.arange(size)[:, None] - np.arange(size)[None, :])
    return np.where(distance < len(weights), np.array(weights)[np.minimum(distance, len(weights) - 1)], 0.0)


def dense_jump(jump, spacing, size):
    far = np.arange(-int(200 / spacing) - 1, int(200 / spacing) + 2)
    total = jump.density(far * spacing).sum()
    distance = np.arange(size)[:, None] - np.arange(size)[None, :]
    return jump.density(distance * spacing) / total


def enumerated(model, observations, grid, dispersion, wander):
    """Run-length posterior (index = length) and pair probabilities by brute force on the given grids."""
    positions = [o.position for o in observations]
    n = len(observations)
    by_length = np.zeros(n + 1)
    by_pair = np.zeros(dispersion.size)
    priors = {w: p / sum(q for _, q in model.wanders) for w, p in model.wanders}
    for pair in range(dispersion.size):
        first, size = int(grid.start[pair]), int(grid.size[pair])
        level = np.exp(grid.log_level[first : first + size])
        spacing = float(grid.spacing[pair])
        jump = dense_jump(model.jump, spacing, size)
        chances = [count_probability(model, o, o.exposure * level, dispersion[pair]) for o in observations]
        walks = [
            dense_walk(size, wander[pair] * math.sqrt(b - a) / spacing)
            for a, b in itertools.pairwise(positions)
        ]
        for cuts in itertools.product((False, True), repeat=n - 1):
            starts = [0, *(i + 1 for i, cut in enumerate(cuts) if cut)]
            weight = np.full(size, spacing) * chances[0]
            for i in range(1, n):
                weight = walks[i - 1] @ weight
                weight = (jump @ weight if cuts[i - 1] else weight) * chances[i]
            mass = weight.sum() * segmentation_prior(model.gap, positions, starts, model.first_run)
            mass *= priors[wander[pair]]
            by_length[n - starts[-1]] += mass
            by_pair[pair] += mass
    return by_length / by_length.sum(), by_pair / by_pair.sum()


CASES = {
    "even gaps, k = 2": (
        Model(
            gap=GapPrior(2, 9.0), dispersions=(2.0, 30.0), wanders=((0.0, 1.0), (0.1, 0.5)), accuracy=UNMERGED
        ),
        [Observation(i, x) for i, x in enumerate([14, 9, 12, 31, 28, 40, 33, 30])],
    ),
    "k = 3, ordinary first run, Poisson": (
        Model(
            gap=GapPrior(3, 8.0),
            dispersions=(math.inf,),
            wanders=((0.0, 1.0),),
            first_run="ordinary",
            accuracy=UNMERGED,
        ),
        [Observation(i, x) for i, x in enumerate([3, 5, 4, 4, 11, 14, 12])],
    ),
    "uneven gaps, exposure, uncertain exposure, one-off": (
        Model(
            gap=GapPrior(2, 12.0),
            jump=JumpPrior(0.2, 0.5),
            dispersions=(5.0, 60.0),
            wanders=((0.02, 1.0), (0.3, 0.5)),
            accuracy=UNMERGED,
        ),
        [
            Observation(0, 40),
            Observation(1, 33, 0.8),
            Observation(4, 700),
            Observation(5, 38, 1.2, 0.3),
            Observation(11, 80),
            Observation(12, 95),
            Observation(14, 20, 0.25, 0.5),
        ],
    ),
    "constant hazard, no one-offs": (
        Model(
            gap=GapPrior(1, 6.0),
            one_off_share=0.0,
            dispersions=(1.0, 8.0),
            wanders=((0.05, 1.0),),
            accuracy=UNMERGED,
        ),
        [Observation(i, x) for i, x in enumerate([2, 0, 3, 1, 9, 7, 12, 10])],
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_equals_the_sum_over_all_segmentations(name):
    model, observations = CASES[name]
    rule = Rule(fewest_counts=1, lasting=1)
    for n in range(2, len(observations) + 1):
        advanced = advance(start(model), observations[:n], rule)
        state, said = advanced.checkpoint.state, advanced.posteriors[-1]
        by_length, by_pair = enumerated(
            model, observations[:n], state.grid, state.bench.dispersion, state.bench.wander
        )
        got = np.zeros(n + 1)
        got[list(said.run_lengths.shortest)] = said.run_lengths.probability
        assert said.run_lengths.shortest == said.run_lengths.longest
        np.testing.assert_allclose(got, by_length, atol=1e-10)
        np.testing.assert_allclose(np.exp(state.log_weight), by_pair, atol=1e-10)


def test_an_empty_count_is_a_longer_gap():
    model, observations = CASES["uneven gaps, exposure, uncertain exposure, one-off"]
    missing = [*observations[:2], Observation(2, None), Observation(3, None), *observations[2:]]
    with_missing = advance(start(model), missing, Rule())
    without = advance(start(model), observations, Rule())
    assert with_missing.posteriors[2:4] == (None, None)
    assert with_missing.posteriors[-1] == without.posteriors[-1]
