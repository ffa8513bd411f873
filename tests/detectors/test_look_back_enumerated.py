"""Looking back against the sum over all segmentations, written out with dense matrices."""

import itertools
import math

import numpy as np
import pytest
from scipy import stats

from detectors.accuracy import Accuracy
from detectors.gap_prior import GapPrior
from detectors.jump_prior import IndependentLevels, JumpPrior
from detectors.level_grid import LevelGrid
from detectors.look_back import look_back
from detectors.look_back_chain import chain_for
from detectors.look_back_levels import effect_at
from detectors.look_back_passes import both_passes
from detectors.look_back_segments import probability_of
from detectors.look_back_stretches import chance_of_shift
from detectors.model import Model
from detectors.observation import Observation
from detectors.quantiles import level_quantiles
from detectors.wander_kernel import kernel

ALL_PAIRS = Accuracy(merging=math.inf, drop_below=0.0, crop_below=0.0, early=1000)


def gap_pmf(gap, t):
    if t < gap.shape:
        return 0.0
    return math.comb(t - 1, gap.shape - 1) * gap.p**gap.shape * (1 - gap.p) ** (t - gap.shape)


def survival(gap, a):
    return 1.0 - math.fsum(gap_pmf(gap, t) for t in range(1, a + 1))


def first_survival(gap, a):
    return 1.0 - math.fsum(survival(gap, g) for g in range(a)) / gap.mean


def prior_of(model, positions, starts):
    """Prior probability of runs that start at the given counts (0 first), the last one still alive."""
    total, gap = 1.0, model.gap
    for run, begin in enumerate(starts):
        equilibrium = run == 0 and model.first_run == "equilibrium"
        alive = first_survival if equilibrium else survival
        if run + 1 < len(starts):
            end = starts[run + 1]
            before, now = (positions[place] - positions[begin] for place in (end - 1, end))
            total *= alive(gap, before) - alive(gap, now)
        else:
            total *= alive(gap, positions[-1] - positions[begin])
    return total


def parts_of_count(model, observation, level, dispersion):
    """Probability of a count at each level, and the one-off part of it."""
    mean, c = observation.exposure * level, observation.relative_sd
    if math.isinf(dispersion) and c == 0:
        nb = stats.poisson.pmf(observation.count, mean)
    else:
        effective = 1.0 / (1.0 / dispersion + c**2 + c**2 / dispersion)
        nb = stats.nbinom.pmf(observation.count, effective, effective / (effective + mean))
    upper = 1.0 / (1.0 + (mean / (observation.count + 0.5)) ** model.one_off_tail)
    lower = 0.0
    if observation.count > 0:
        lower = 1.0 / (1.0 + (mean / (observation.count - 0.5)) ** model.one_off_tail)
    one_off = model.one_off_share * (upper - lower)
    return (1 - model.one_off_share) * nb + one_off, one_off


def walk_matrix(size, step):
    weights = kernel(round(step, 12))
    distance = np.abs(np.arange(size)[:, None] - np.arange(size)[None, :])
    return np.where(distance < len(weights), np.array(weights)[np.minimum(distance, len(weights) - 1)], 0.0)


def jump_matrix(jump, levels, spacing):
    """At [after, before]."""
    size = levels.size
    if isinstance(jump, IndependentLevels):
        return np.repeat((jump.density(levels) * spacing)[:, None], size, axis=1)
    far = np.arange(-int(200 / spacing) - 1, int(200 / spacing) + 2)
    distance = np.arange(size)[:, None] - np.arange(size)[None, :]
    return jump.density(distance * spacing) / jump.density(far * spacing).sum()


class Enumerated:
    """Everything that is asked of a look back, by brute force on given grids; nothing is normalised."""

    def __init__(self, model, counts, chain):
        grid, n = chain.bench.grid, len(counts)
        self.by_starts, self.level, self.one_off = {}, np.zeros((n, grid.rows)), np.zeros(n)
        self.before, self.after = np.zeros((n, grid.rows)), np.zeros((n, grid.rows))
        self.ratios = LevelGrid(grid.spacing, 1 - grid.size, 2 * grid.size - 1)
        self.ratio = np.zeros((n, self.ratios.rows))
        for pair in range(grid.size.size):
            self._pair(model, counts, chain, pair)
        self.evidence = sum(self.by_starts.values())

    def _pair(self, model, counts, chain, pair):
        grid, n = chain.bench.grid, len(counts)
        rows = slice(int(grid.start[pair]), int(grid.start[pair] + grid.size[pair]))
        into = slice(int(self.ratios.start[pair]), int(self.ratios.start[pair] + self.ratios.size[pair]))
        spacing, levels, size = float(grid.spacing[pair]), grid.log_level[rows], int(grid.size[pair])
        parts = [
            parts_of_count(model, one, np.exp(levels), float(chain.bench.dispersion[pair])) for one in counts
        ]
        positions = [one.position for one in counts]
        wander = float(chain.bench.wander[pair])
        walks = [
            walk_matrix(size, wander * math.sqrt(b - a) / spacing) for a, b in itertools.pairwise(positions)
        ]
        jump = jump_matrix(model.jump, levels, spacing)
        first = np.full(size, spacing / 46.0)
        if isinstance(model.jump, IndependentLevels):
            first = model.jump.density(levels) * spacing
        for cuts in itertools.product((False, True), repeat=n - 1):
            starts = (0, *(i + 1 for i, cut in enumerate(cuts) if cut))
            prior = prior_of(model, positions, starts) * math.exp(chain.log_prior[pair])
            steps = [jump @ walk if cut else walk for cut, walk in zip(cuts, walks, strict=True)]
            ahead = [np.ones(size)]
            for i in range(n - 1, 0, -1):
                ahead.insert(0, steps[i - 1].T @ (parts[i][0] * ahead[0]))
            weight = first * parts[0][0]
            for i in range(n):
                if i > 0:
                    left = walks[i - 1] @ weight
                    weight = steps[i - 1] @ weight * parts[i][0]
                mass = weight * ahead[i] * prior
                self.level[i, rows] += mass
                self.one_off[i] += (mass * parts[i][1] / parts[i][0]).sum()
                if i > 0 and cuts[i - 1]:
                    joint = jump * left[None, :] * (parts[i][0] * ahead[i])[:, None] * prior
                    self.before[i, rows] += joint.sum(axis=0)
                    self.after[i, rows] += joint.sum(axis=1)
                    self.ratio[i, into] += [np.trace(joint, offset=-d) for d in range(1 - size, size)]
            self.by_starts[starts[1:]] = self.by_starts.get(starts[1:], 0.0) + mass.sum()

    def chance(self, holds):
        return sum(mass for starts, mass in self.by_starts.items() if holds(starts)) / self.evidence


CASES = {
    "even gaps, k = 2": (
        Model(
            gap=GapPrior(2, 9.0),
            dispersions=(2.0, 30.0),
            wanders=((0.0, 1.0), (0.1, 0.5)),
            accuracy=ALL_PAIRS,
        ),
        [Observation(i, x) for i, x in enumerate([14, 9, 12, 31, 28, 40, 33])],
    ),
    "k = 3, ordinary first run, Poisson": (
        Model(
            gap=GapPrior(3, 8.0),
            dispersions=(math.inf,),
            wanders=((0.0, 1.0),),
            first_run="ordinary",
            accuracy=ALL_PAIRS,
        ),
        [Observation(i, x) for i, x in enumerate([3, 5, 4, 4, 11, 14, 12])],
    ),
    "uneven gaps, exposure, uncertain exposure, one-off": (
        Model(
            gap=GapPrior(2, 12.0),
            jump=JumpPrior(0.2, 0.5),
            dispersions=(5.0, 60.0),
            wanders=((0.02, 1.0), (0.3, 0.5)),
            accuracy=ALL_PAIRS,
        ),
        [
            Observation(0, 40),
            Observation(1, 33, 0.8),
            Observation(4, 700),
            Observation(5, 38, 1.2, 0.3),
            Observation(11, 80),
            Observation(14, 20, 0.25, 0.5),
        ],
    ),
    "constant hazard, no one-offs": (
        Model(
            gap=GapPrior(1, 6.0),
            one_off_share=0.0,
            dispersions=(1.0, 8.0),
            wanders=((0.05, 1.0),),
            accuracy=ALL_PAIRS,
        ),
        [Observation(i, x) for i, x in enumerate([2, 0, 3, 1, 9, 7])],
    ),
    "levels drawn afresh": (
        Model(
            gap=GapPrior(2, 5.0),
            jump=IndependentLevels(2.0, 0.5, lowest=-8.0, highest=4.5, spacing=0.1),
            dispersions=(3.0, math.inf),
            wanders=((0.0, 1.0),),
            accuracy=ALL_PAIRS,
        ),
        [Observation(i, x) for i, x in enumerate([2, 4, 3, 11, 9])],
    ),
}


@pytest.fixture(scope="module", params=CASES)
def case(request):
    model, counts = CASES[request.param]
    passes = both_passes(chain_for(model, counts))
    return model, counts, passes, Enumerated(model, counts, passes.chain)


def test_shift_probability_and_evidence(case):
    model, counts, _, truth = case
    expected = [truth.chance(lambda starts, i=i: i in starts) for i in range(len(counts))]
    said = look_back(model, counts)
    np.testing.assert_allclose(said.shift_probability, expected, atol=1e-9)
    assert said.log_evidence == pytest.approx(math.log(truth.evidence), abs=1e-9)


def test_level_and_one_offs(case):
    _, _, passes, truth = case
    np.testing.assert_allclose(passes.level_mass, truth.level / truth.evidence, atol=1e-9)
    np.testing.assert_allclose(passes.one_off, truth.one_off / truth.evidence, atol=1e-9)


def test_number_of_shifts(case):
    model, counts, _, truth = case
    said = look_back(model, counts).number
    expected = [truth.chance(lambda starts, k=k: len(starts) == k) for k in range(len(counts))]
    np.testing.assert_allclose(said, expected[: len(said)], atol=1e-9)
    assert sum(expected[len(said) :]) < 1e-9


def test_chance_of_a_shift_in_a_stretch(case):
    _, counts, passes, truth = case
    for first, last in itertools.combinations_with_replacement(range(1, len(counts)), 2):
        expected = truth.chance(lambda starts, a=first, b=last: any(a <= s <= b for s in starts))
        assert chance_of_shift(passes, first, last) == pytest.approx(expected, abs=1e-9)


def test_every_segmentation(case):
    _, _, passes, truth = case
    for starts, mass in truth.by_starts.items():
        assert probability_of(passes, starts) == pytest.approx(mass / truth.evidence, abs=1e-9)


def test_most_probable_segmentation(case):
    model, counts, _, truth = case
    said = look_back(model, counts).segmentation
    best = max(truth.by_starts, key=truth.by_starts.__getitem__)
    assert said.starts == best
    assert said.probability == pytest.approx(truth.by_starts[best] / truth.evidence, abs=1e-9)


def test_levels_on_both_sides_and_the_effect(case):
    _, counts, passes, truth = case
    grid = passes.chain.bench.grid
    # No run of the third case can end before its third count.
    for dates in ([3], [len(counts) - 1], [2, 3], list(range(1, len(counts)))):
        said = effect_at(passes, dates)
        for got, on, mass in (
            (said.level_before, grid, truth.before),
            (said.level_after, grid, truth.after),
            (said.effect, truth.ratios, truth.ratio),
        ):
            expected = level_quantiles(on, mass[dates].sum(axis=0))
            assert (got.low, got.mid, got.high) == pytest.approx(
                (expected.low, expected.mid, expected.high), rel=1e-6
            )
