"""Looking back: figures of the change-point literature, agreement with the filter, calibration, hard records.

Coal-mining disasters: R. G. Jarrett, A note on the intervals between coal-mining disasters, Biometrika 66
(1979) 191-193, per year 1851 to 1962. The expected figures under the priors of Fearnhead (2006) were
recomputed for this project with his recursion in 40-digit arithmetic; no one has published them.
"""

import json
import math
from dataclasses import replace
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest

from detectors.accuracy import Accuracy
from detectors.advance import advance, start
from detectors.errors import NotInOrder, UnusableParameter
from detectors.gap_prior import GapPrior
from detectors.judge import Rule
from detectors.jump_prior import IndependentLevels
from detectors.look_back import effect_of, look_back
from detectors.look_back_chain import chain_for
from detectors.look_back_passes import both_passes
from detectors.model import Model
from detectors.observation import Observation
from detectors.simulation import NO_ONE_OFFS, OneOffs, as_observations, simulate, stepped

VECTORS = Path(__file__).parents[1] / "vectors"
COUNTS = json.loads((VECTORS / "series.json").read_text(encoding="utf-8"))["coal"]["counts"]


def observed(counts):
    return [Observation(place, count) for place, count in enumerate(counts)]


def product_partition(shape, mean, first_run="ordinary"):
    return Model(
        gap=GapPrior(shape, mean),
        one_off_share=0.0,
        jump=IndependentLevels(shape=1.0, rate=1.0),
        dispersions=(math.inf,),
        wanders=((0.0, 1.0),),
        first_run=first_run,
    )


@pytest.mark.parametrize(
    ("shape", "number", "mean", "best", "years"),
    [
        (
            1,
            [8.1735e-15, 0.06870616103, 0.3393866081, 0.2994893296, 0.1814307950, 0.07760029184],
            2.970341633,
            0.021410006,
            {1947: 0.381042635, 1891: 0.210177272, 1890: 0.168850224, 1948: 0.154276348, 1889: 0.143460560},
        ),
        (
            2,
            [2.9584e-15, 0.05802750496, 0.5094514563, 0.3107104214, 0.1034965767, 0.01668753236],
            2.516343822,
            0.034728182,
            {1947: 0.379960812, 1891: 0.205938005, 1890: 0.167222450, 1948: 0.157573083, 1889: 0.142201374},
        ),
        (
            3,
            [1.3165e-15, 0.0496338969, 0.6294591638, 0.2713189268, 0.0466237999, 0.002883563067],
            2.323907089,
            0.044561548,
            {1947: 0.380173808, 1891: 0.206940573, 1890: 0.169268640, 1948: 0.161564291, 1889: 0.143946954},
        ),
    ],
)
def test_coal_under_fearnheads_priors(shape, number, mean, best, years):
    """A year is the last of the old level; the shift is found at the count after it."""
    said = look_back(product_partition(shape, 50.0), observed(COUNTS))
    assert said.number[:6] == pytest.approx(number, abs=1e-9)
    assert np.dot(said.number, range(len(said.number))) == pytest.approx(mean, abs=1e-8)
    assert said.segmentation.starts == (1892 - 1851, 1948 - 1851)
    assert said.segmentation.probability == pytest.approx(best, abs=1e-9)
    probable = np.argsort(-np.array(said.shift_probability))[:5] + 1850
    assert probable.tolist() == list(years)
    got = [said.shift_probability[year - 1850] for year in years]
    assert got == pytest.approx(list(years.values()), abs=1e-9)


@pytest.mark.parametrize(
    ("shape", "first_run", "log_evidence"),
    [
        (2, "ordinary", -175.799724483802295),
        (2, "equilibrium", -175.972421859224588),
        (5, "equilibrium", -175.664518418410491),
    ],
)
def test_evidence_of_all_years(shape, first_run, log_evidence):
    """The same figures as the filter's, by a forward filter and Fearnhead's backward recursion."""
    said = look_back(product_partition(shape, 50.0, first_run), observed(COUNTS))
    assert said.log_evidence == pytest.approx(log_evidence, abs=1e-8)


def test_the_last_run_start_is_the_filters():
    """At the last count nothing lies ahead: P(run starts 1948) at 1962 is 0.345325439396 either way."""
    chain = chain_for(product_partition(2, 50.0), observed(COUNTS))
    passes = both_passes(chain)
    weights = passes.forward[97 - 1]
    index, shifted = 97, None
    for index in range(97, len(COUNTS)):
        step = chain.phases(index)
        moved = chain.walked(index, weights if shifted is None else shifted)
        if shifted is None:
            shifted = np.zeros_like(weights)
            shifted[:, -1] = chain.jump((moved @ step.leave)[:, None])[:, 0]
        else:
            shifted = moved @ step.stay
        shifted *= chain.likelihood(index).probability[:, None] / np.exp(passes.log_scale[index][0])
    assert shifted.sum() == pytest.approx(0.345325439396, abs=1e-9)


def test_fractions():
    """Counts 4, 5, 4: ratios of integers worked out by hand from the segment marginals."""
    said = look_back(product_partition(2, 10.0), observed([4, 5, 4]))
    assert math.exp(said.log_evidence) == pytest.approx(893960767 / 2751882854400, rel=1e-9)
    assert said.shift_probability == pytest.approx([0.0, 0.0, 1048576 / 127708681], abs=1e-10)
    assert said.number[0] == pytest.approx(126660105 / 127708681, abs=1e-10)


def test_coal_has_two_shifts_with_disconnected_regions():
    said = look_back(product_partition(2, 50.0), observed(COUNTS))
    first, second = said.shifts
    assert (first.index + 1850, second.index + 1850) == (1891, 1947)
    assert first.probability > 0.95
    assert set(range(1887, 1893)) < {index + 1850 for index in first.region.indices}
    assert first.region.modes[0] == first.index
    assert first.effect.low < 0.3 < first.effect.high
    assert first.effect.high < 1.0


def counts_with_a_fall(seed, size=160, at=90, factor=0.5):
    random = np.random.default_rng(seed)
    return as_observations(
        simulate(stepped(200.0, size, change_at=at, factor=factor), 12.0, OneOffs(0.03), random)
    )


def test_evidence_equals_the_filters():
    model = Model(
        dispersions=(4.0, 12.0), accuracy=Accuracy(merging=math.inf, drop_below=0.0, crop_below=0.0)
    )
    observations = counts_with_a_fall(1)
    filtered = advance(start(model), observations, Rule()).posteriors
    said = look_back(model, observations)
    assert said.log_evidence == pytest.approx(sum(p.log_predictive for p in filtered), abs=0.01)
    assert said.level[-1].mid == pytest.approx(filtered[-1].level.mid, rel=1e-3)
    assert said.one_off[-1] == pytest.approx(filtered[-1].one_off, abs=1e-4)
    assert said.dispersion.probability == pytest.approx(filtered[-1].dispersion.probability, abs=1e-3)


@pytest.mark.parametrize("seed", [1, 2])
def test_a_finer_grid_says_the_same(seed):
    model = Model(dispersions=(4.0, 8.0, 12.0, 16.0))
    observations = counts_with_a_fall(seed, size=100, at=60, factor=0.75)
    finer = replace(model, accuracy=Accuracy(spacing=0.5))
    said, again = look_back(model, observations), look_back(finer, observations)
    np.testing.assert_allclose(said.shift_probability, again.shift_probability, atol=1e-3)
    np.testing.assert_allclose(said.one_off, again.one_off, atol=1e-3)
    for one, other in zip(said.level, again.level, strict=True):
        # A quantile is read off between nodes, so its error goes with the width of the band: a twentieth here.
        width = other.high - other.low
        assert (one.low, one.mid, one.high) == pytest.approx(
            (other.low, other.mid, other.high), abs=width / 20
        )


def test_parts_agree():
    """What is expected in number is the sum of the probabilities; the segmentation is one of the numbers."""
    said = look_back(Model(), counts_with_a_fall(3))
    expected = np.dot(said.number, range(len(said.number)))
    assert expected == pytest.approx(sum(said.shift_probability), abs=1e-8)
    (start_of_run,) = said.segmentation.starts
    assert said.shift_probability[start_of_run] == max(said.shift_probability)
    assert said.segmentation.probability <= said.number[1]
    assert sum(said.number) == pytest.approx(1.0, abs=1e-12)


def test_a_missing_count_is_a_longer_gap():
    observations = counts_with_a_fall(4)
    hidden = [replace(one, count=None) if one.position in (20, 21, 90) else one for one in observations]
    left_out = [one for one in observations if one.position not in (20, 21, 90)]
    with_missing, without = look_back(Model(), hidden), look_back(Model(), left_out)
    assert [place for place, p in enumerate(with_missing.shift_probability) if p is None] == [20, 21, 90]
    assert [p for p in with_missing.shift_probability if p is not None] == list(without.shift_probability)
    assert with_missing.shifts[0].index == without.shifts[0].index + 3 == 91
    assert with_missing.level[90] is None
    assert with_missing.number == without.number


def test_the_effect_at_given_dates_is_the_shifts():
    observations = counts_with_a_fall(5)
    observations[30] = replace(observations[30], count=None)
    (shift,) = look_back(Model(), observations).shifts
    said = effect_of(Model(), observations, shift.region.indices)
    assert (said.level_before, said.level_after) == (shift.level_before, shift.level_after)
    assert said.effect == shift.effect
    for dates in ([], [0], [30]):
        with pytest.raises(UnusableParameter, match="at which a shift is possible"):
            effect_of(Model(), observations, dates)


def test_a_one_off_is_no_shift():
    observations = as_observations(simulate(np.full(80, 100.0), 20.0, NO_ONE_OFFS, np.random.default_rng(6)))
    observations[40] = Observation(40, 3000)
    said = look_back(Model(), observations)
    assert said.shifts == ()
    assert said.one_off[40] > 0.99
    assert said.number[0] > 0.95


def test_two_shifts_are_told_apart():
    levels = np.concatenate((np.full(50, 100.0), np.full(40, 45.0), np.full(50, 90.0)))
    said = look_back(Model(), as_observations(simulate(levels, 20.0, NO_ONE_OFFS, np.random.default_rng(7))))
    assert [abs(shift.index - at) <= 2 for shift, at in zip(said.shifts, (50, 90), strict=True)] == [True] * 2
    down, up = said.shifts
    assert down.effect.high < 0.7 < 1.4 < up.effect.low
    assert said.number[2] > 0.8


@pytest.mark.parametrize(
    "counts",
    [[], [None], [0], [7], [0] * 40, [1000] * 40, [50] * 20 + [10**9] + [50] * 20, [3] * 12 + [3000] * 12],
)
def test_hard_records_give_no_nonsense(counts):
    said = look_back(Model(), observed(counts))
    for value in (*said.shift_probability, *said.one_off, *said.number, said.segmentation.probability):
        assert value is None or 0.0 <= value <= 1.0
    for level in said.level:
        assert level is None or 0.0 < level.low <= level.mid <= level.high < math.inf
    assert math.isfinite(said.log_evidence)
    assert len(said.shifts) == (1 if 3000 in counts else 0)


def test_counts_that_no_run_explains():
    """Poisson, no one-offs, and no shift possible when it is needed: still probabilities, and no warning."""
    model = Model(one_off_share=0.0, dispersions=(math.inf,), wanders=((0.0, 1.0),), gap=GapPrior(6, 100.0))
    said = look_back(model, observed([1, 1, 1, 10**6, 1, 10**6, 1, 1, 1]))
    assert all(0.0 <= p <= 1.0 for p in said.shift_probability)
    assert sum(said.number) == pytest.approx(1.0)


def test_observations_must_come_in_order():
    with pytest.raises(NotInOrder):
        look_back(Model(), [Observation(3, 5), Observation(3, 6)])


def test_regions_do_not_overlap():
    said = look_back(product_partition(1, 20.0), observed(COUNTS))
    for one, other in pairwise(said.shifts):
        assert one.region.indices[-1] < other.region.indices[0]
