"""Truths drawn from the model itself must rank evenly among what the filter believes of them.

S. Talts, M. Betancourt, D. Simpson, A. Vehtari and A. Gelman (2018), Validating Bayesian inference algorithms
with simulation-based calibration, arXiv:1804.06788. Here every posterior is discrete and known, so the rank
of the truth is its randomised distribution function, evenly distributed on 0 to 1 if every step is right:
hazard, first run, jump prior, wander, dispersion, one-offs. Seeds are fixed; the bound is the 99.9 % point.
"""

import math

import numpy as np
import pytest
from scipy import stats

from detectors.advance import advance, start
from detectors.gap_prior import GapPrior
from detectors.judge import Rule
from detectors.jump_prior import JumpPrior
from detectors.model import Model
from detectors.observation import Observation
from detectors.posterior import Posterior, Weighted

STREAMS = 150
LENGTH = 40
BINS = 10
WANDERS = ((0.0, 1.0), (0.08, 1.0))
MODEL = Model(
    gap=GapPrior(2, 25.0),
    one_off_share=0.05,
    jump=JumpPrior(0.15, 0.4),
    dispersions=(2.0, 8.0, 60.0, math.inf),
    wanders=WANDERS,
)


def starts_of_runs(rng: np.random.Generator) -> set[int]:
    """Places of the first counts of runs; of the first run only what is left at a random moment."""
    gap = MODEL.gap
    # The first run ends with 1 .. shape more successes, equally likely.
    needed = int(rng.integers(1, gap.shape + 1))
    place, starts = 0, set()
    while True:
        place += int(rng.negative_binomial(needed, gap.p)) + needed
        if place >= LENGTH:
            return starts
        starts.add(place)
        needed = gap.shape


def jump(rng: np.random.Generator) -> float:
    """A jump of the log level, by inverting the distribution function: of u it is (u^2 / (1 + u^2))^(3/2)."""
    prior = MODEL.jump
    assert isinstance(prior, JumpPrior)
    share = rng.random() ** (2.0 / 3.0)
    u = math.sqrt(share / (1.0 - share))
    return float(rng.choice([-1.0, 1.0])) * (prior.smallest + prior.scale * u)


def one_off(rng: np.random.Generator, mean: float) -> int:
    """The log-logistic with median `mean` and tail 1, to the nearest whole number."""
    share = rng.random()
    return min(math.floor(mean * share / (1.0 - share) + 0.5), 2**50)


def drawn(seed: int) -> tuple[list[int], dict[str, float]]:
    """Counts and the truths behind them at the last count."""
    rng = np.random.default_rng([2018, seed])
    starts = starts_of_runs(rng)
    dispersion = float(rng.choice(MODEL.dispersions))
    wander = float(rng.choice([w for w, _ in WANDERS]))
    log_level, last_start, counts = rng.uniform(math.log(30.0), math.log(3_000.0)), 0, []
    for place in range(LENGTH):
        log_level += wander * rng.normal() if place else 0.0
        if place in starts:
            log_level += jump(rng)
            last_start = place
        mean = math.exp(min(log_level, 25.0))
        if rng.random() < MODEL.one_off_share:
            counts.append(one_off(rng, mean))
        else:
            mixed = mean if math.isinf(dispersion) else mean * rng.gamma(dispersion, 1.0 / dispersion)
            counts.append(int(rng.poisson(mixed)))
    return counts, {
        "run length": float(LENGTH - last_start),
        "dispersion": dispersion,
        "wander": wander,
        "log level": log_level,
    }


def randomised(values: np.ndarray, probability: np.ndarray, truth: float, uniform: float) -> float:
    below, at = probability[values < truth].sum(), probability[values == truth].sum()
    return float(below + uniform * at)


def rank_of(weighted: Weighted, truth: float, uniform: float) -> float:
    return randomised(np.array(weighted.value), np.array(weighted.probability), truth, uniform)


def run_length_rank(said: Posterior, truth: float, uniform: float) -> float:
    lengths = said.run_lengths
    return randomised(np.array(lengths.shortest), np.array(lengths.probability), truth, uniform)


@pytest.fixture(scope="module")
def ranks() -> dict[str, np.ndarray]:
    result: dict[str, list[float]] = {
        name: [] for name in ("run length", "dispersion", "wander", "pit", "level")
    }
    rng = np.random.default_rng(1)
    for seed in range(STREAMS):
        counts, truth = drawn(seed)
        posteriors = advance(
            start(MODEL), [Observation(i, x) for i, x in enumerate(counts)], Rule()
        ).posteriors
        last = posteriors[-1]
        assert last is not None
        result["run length"].append(run_length_rank(last, truth["run length"], rng.random()))
        result["dispersion"].append(rank_of(last.dispersion, truth["dispersion"], rng.random()))
        result["wander"].append(rank_of(last.wander, truth["wander"], rng.random()))
        result["level"].append(
            float(
                np.searchsorted(np.log([last.level.low, last.level.mid, last.level.high]), truth["log level"])
            )
        )
        for said in posteriors[5::7]:
            assert said is not None
            result["pit"].append(said.pit[0] + rng.random() * (said.pit[1] - said.pit[0]))
    return {name: np.array(values) for name, values in result.items()}


@pytest.mark.parametrize("name", ["run length", "dispersion", "wander", "pit"])
def test_truths_rank_evenly(ranks: dict[str, np.ndarray], name: str) -> None:
    found, _ = np.histogram(ranks[name], bins=BINS, range=(0.0, 1.0))
    expected = ranks[name].size / BINS
    statistic = float(((found - expected) ** 2 / expected).sum())
    assert statistic <= stats.chi2(BINS - 1).ppf(0.999), found


def test_levels_fall_into_their_quantiles(ranks: dict[str, np.ndarray]) -> None:
    # Below 5 %, 5 to 50, 50 to 95, above.
    found = np.bincount(ranks["level"].astype(int), minlength=4)
    expected = STREAMS * np.array([0.05, 0.45, 0.45, 0.05])
    statistic = float(((found - expected) ** 2 / expected).sum())
    assert statistic <= stats.chi2(3).ppf(0.999), found
