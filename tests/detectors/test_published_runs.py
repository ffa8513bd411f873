"""The filter under the priors of the product-partition literature, on the coal-mining disasters.

Counts: R. G. Jarrett, A note on the intervals between coal-mining disasters, Biometrika 66 (1979) 191-193,
explosions with 10 or more deaths in each of the years 1851 to 1962 (the form that `boot::coal` in R gives).
Expected figures: recomputed for this project with a forward filter and Fearnhead's backward recursion in
40-digit arithmetic (and, for 12 years, by enumerating all 2048 segmentations); no one has published them.
"""

import math

import numpy as np
import pytest

from detectors.accuracy import Accuracy
from detectors.advance import advance, start
from detectors.gap_prior import GapPrior
from detectors.judge import Rule
from detectors.jump_prior import IndependentLevels
from detectors.model import Model
from detectors.observation import Observation

COAL = """
4 5 4 1 0 4 3 4 0 6 3 3 4 0 2 6 3 3 5 4 5 3 1 4 4 1 5 5 3 4 2 5 2 2 3 4 2 1 3 2 2 1 1 1 1 3 0 0 1 0 1 1 0 0 3 1
0 3 2 2 0 1 1 1 0 1 0 1 0 0 0 2 1 0 0 0 1 1 0 2 3 3 1 1 2 1 1 1 1 2 3 3 0 0 0 1 4 0 0 0 1 0 0 0 0 0 1 0 0 1 0 1
"""
COUNTS = [int(word) for word in COAL.split()]

UNMERGED = Accuracy(merging=math.inf, drop_below=0.0, crop_below=0.0, early=1000)


def product_partition(shape, mean, first_run):
    return Model(
        gap=GapPrior(shape, mean),
        one_off_share=0.0,
        jump=IndependentLevels(shape=1.0, rate=1.0),
        dispersions=(math.inf,),
        wanders=((0.0, 1.0),),
        first_run=first_run,
        accuracy=UNMERGED,
    )


def folded(model, counts):
    return advance(start(model), [Observation(i, x) for i, x in enumerate(counts)], Rule()).posteriors


def by_length(said):
    result = np.zeros(said.counted + 1)
    result[list(said.run_lengths.shortest)] = said.run_lengths.probability
    return result


@pytest.mark.parametrize(
    ("shape", "first_run", "log_evidence", "run_12", "run_1", "run_3"),
    [
        (1, "ordinary", -28.4595293752068668, 0.74741394084593, 0.0320142965697274, 0.0353847336043823),
        (1, "equilibrium", -28.4595293752068668, 0.74741394084593, 0.0320142965697274, 0.0353847336043823),
        (2, "ordinary", -28.4493523585326603, 0.759442491611447, 0.0420166565237272, 0.0308141013982584),
        (2, "equilibrium", -28.7460025420227186, 0.647084171708827, 0.0442451212116535, 0.0359145095103478),
        (3, "ordinary", -28.4555226491301105, 0.741886646079224, 0.0517397397035629, 0.0382916934138429),
        (3, "equilibrium", -28.9150224197591716, 0.557752961404829, 0.0533538025984407, 0.0467280002769745),
    ],
)
def test_first_twelve_years(shape, first_run, log_evidence, run_12, run_1, run_3):
    said = folded(product_partition(shape, 10.0, first_run), COUNTS[:12])
    assert sum(p.log_predictive for p in said) == pytest.approx(log_evidence, abs=1e-9)
    lengths = by_length(said[-1])
    assert lengths[[12, 1, 3]] == pytest.approx([run_12, run_1, run_3], abs=1e-10)


@pytest.mark.parametrize(
    ("shape", "first_run", "log_evidence", "run_15", "mean_length"),
    [
        (1, "ordinary", -176.254460709435001, 0.306587036519, 19.1559137767),
        (2, "ordinary", -175.799724483802295, 0.345325439396, 18.1783079953),
        (2, "equilibrium", -175.972421859224588, 0.345535299917, 18.1658001043),
        (3, "ordinary", -175.558952339738471, 0.363406711456, 17.7030979933),
        (3, "equilibrium", -175.831496145719906, 0.3638624812, 17.6816351233),
        (5, "ordinary", -175.274406284093442, 0.373499472111, 17.0455590977),
        (5, "equilibrium", -175.664518418410491, 0.374596900951, 17.0128166914),
    ],
)
def test_all_years(shape, first_run, log_evidence, run_15, mean_length):
    said = folded(product_partition(shape, 50.0, first_run), COUNTS)
    assert sum(p.log_predictive for p in said) == pytest.approx(log_evidence, abs=1e-8)
    lengths = by_length(said[-1])
    assert lengths[15] == pytest.approx(run_15, abs=1e-9)
    assert lengths @ np.arange(lengths.size) == pytest.approx(mean_length, abs=1e-6)


@pytest.mark.parametrize(
    ("year", "mode", "probability", "mean_length", "unbroken", "predictive"),
    [
        (1860, 10, 0.960434515665, 9.80557258694, 0.9604345157, 0.0285903171733),
        (1891, 41, 0.801890833223, 35.5408734333, 0.8018908332, 0.217694185379),
        (1895, 45, 0.232835698914, 16.4584602877, 0.2328356989, 0.251161091973),
        (1900, 9, 0.166872931576, 9.3954670177, 0.003241017809, 0.350090373998),
        (1910, 19, 0.141632186269, 19.2532883041, 0.0001193967634, 0.202882627213),
        (1948, 57, 0.089882519702, 37.602322802, 1.121748906e-10, 0.28835420555),
        (1962, 15, 0.345535299917, 18.1658001043, 2.070572824e-15, 0.221186329261),
    ],
)
def test_path_of_the_filter(year, mode, probability, mean_length, unbroken, predictive):
    """Negative-binomial gap of shape 2 and mean 50, first run in equilibrium."""
    said = folded(product_partition(2, 50.0, "equilibrium"), COUNTS[: year - 1850])[-1]
    lengths = by_length(said)
    assert said.run_length_mode == mode
    assert lengths[mode] == pytest.approx(probability, abs=1e-9)
    assert lengths @ np.arange(lengths.size) == pytest.approx(mean_length, abs=1e-6)
    assert lengths[said.counted] == pytest.approx(unbroken, rel=1e-6)
    assert math.exp(said.log_predictive) == pytest.approx(predictive, abs=1e-9)


@pytest.mark.parametrize(
    ("shape", "mean", "first_run", "evidence", "lengths"),
    [
        (1, 10.0, "ordinary", 2778795709 / 9784472371200, [60213248 / 2778795709, 58720256 / 2778795709]),
        (2, 10.0, "ordinary", 893960767 / 2751882854400, [1048576 / 127708681, 0.0]),
        (2, 10.0, "equilibrium", 310220309 / 1100753141760, [1048576 / 44317187, 1048576 / 44317187]),
    ],
)
def test_three_years_as_fractions(shape, mean, first_run, evidence, lengths):
    """Counts 4, 5, 4: every figure is a ratio of integers, worked out by hand from the segment marginals."""
    said = folded(product_partition(shape, mean, first_run), [4, 5, 4])
    assert math.exp(sum(p.log_predictive for p in said)) == pytest.approx(evidence, rel=1e-9)
    got = by_length(said[-1])
    assert got[[1, 2]] == pytest.approx(lengths, abs=1e-10)
    assert got[3] == pytest.approx(1.0 - sum(lengths), abs=1e-10)
