"""Looking back on records whose truth is drawn from the model: what it says is true as often as it says."""

import math

import numpy as np
import pytest

from detectors.gap_prior import GapPrior
from detectors.look_back import look_back
from detectors.model import Model
from detectors.simulation import as_observations


def drawn_from_the_model(model, size, random):
    """Counts and level at each place, and where shifts lie, all drawn from the model (levels near 100)."""
    level, levels, starts = math.log(random.uniform(60.0, 200.0)), [], []
    needed = int(random.integers(1, model.gap.shape + 1))
    dispersion = random.choice(model.dispersions)
    z = np.linspace(-8.0, 8.0, 16001)
    density = model.jump.density(z)
    for place in range(size):
        if place > 0 and random.random() < model.gap.p:
            needed -= 1
        if needed == 0:
            level += random.choice(z, p=density / density.sum())
            starts.append(place)
            needed = model.gap.shape
        levels.append(level)
    means = np.exp(levels)
    counts = random.poisson(means * random.gamma(dispersion, 1.0 / dispersion, size))
    return as_observations(counts), means, starts


def test_calibration_on_truths_from_the_prior():
    """100 records of 60 counts: regions hold a shift as often as they say, effects lie within 5 to 95 %."""
    model = Model(gap=GapPrior(2, 40.0), one_off_share=0.0, dispersions=(8.0, 32.0), wanders=((0.0, 1.0),))
    random = np.random.default_rng(2024)
    promised, held, inside, covered, shifts, expected = [], [], [], [], 0, 0.0
    for _ in range(100):
        observations, levels, starts = drawn_from_the_model(model, 60, random)
        said = look_back(model, observations)
        expected += sum(said.shift_probability)
        shifts += len(starts)
        covered += [one.low <= level <= one.high for one, level in zip(said.level, levels, strict=True)]
        for shift in said.shifts:
            there = [at for at in starts if at in shift.region.indices]
            promised.append(shift.region.probability)
            held.append(bool(there))
            if len(there) == 1:
                ratio = levels[there[0]] / levels[there[0] - 1]
                inside.append(shift.effect.low <= ratio <= shift.effect.high)
    # Standard errors: about 0.03 for the regions and effects, 0.01 for the level, 8 for the number.
    assert len(promised) > 60
    assert np.mean(held) == pytest.approx(np.mean(promised), abs=0.08)
    assert np.mean(inside) == pytest.approx(0.9, abs=0.08)
    assert np.mean(covered) == pytest.approx(0.9, abs=0.04)
    assert expected == pytest.approx(shifts, abs=25)
