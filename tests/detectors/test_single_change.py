"""The single change-point analysis against published and recomputed figures.

Recomputed figures (30 digits) are this project's own, by enumeration of every date. Sources of the counts
stand with the vectors in tests/vectors.
"""

import csv
import json
import math
from pathlib import Path

import numpy as np
import pytest
from scipy import stats

from detectors.errors import UnusableObservation, UnusableParameter
from detectors.single_change import log_comparison, single_change
from detectors.single_change_laws import BetaNegativeBinomial, PoissonGamma
from detectors.single_change_quadrature import NegativeBinomialGamma, WithOneOffs

VECTORS = Path(__file__).parents[1] / "vectors"
SERIES = json.loads((VECTORS / "series.json").read_text(encoding="utf-8"))
COAL = SERIES["coal"]["counts"]

# Three arrays called "coal" circulate. Jarrett (1979) is the reference; the differences of the one in Albert,
# Bayesian Computation with R, chapter 11, by year:
ALBERT = COAL.copy()
for _year, _count in {1891: 1, 1931: 2, 1941: 4, 1942: 2, 1962: 0}.items():
    ALBERT[_year - 1851] = _count


def column(name):
    with (VECTORS / name).open(encoding="utf-8", newline="") as file:
        return [int(row["count"]) for row in csv.DictReader(file)]


@pytest.mark.parametrize(
    ("counts", "shape", "mode", "probability", "mean", "before", "after", "log_none", "log_one"),
    [
        (
            COAL,
            1.0,
            41,
            0.24502017199388802,
            40.0710101812018,
            (3.06423545174896, 0.28455443),
            (0.92236752442317, 0.11622477),
            -206.449834758327,
            -177.507586503998,
        ),
        # Gamma(2, 1): the prior of Chib (1998), from memory.
        (
            COAL,
            2.0,
            41,
            0.23834870507669811,
            39.9368235234413,
            (3.09284518828858, 0.28636555),
            (0.937655511921312, 0.11705384),
            -205.919727205012,
            -176.467898914429,
        ),
        (
            COAL,
            0.5,
            41,
            0.24817105225300050,
            40.1386223758167,
            (3.04995944916761, 0.28365591),
            (0.914711492766028, 0.11580803),
            -207.285296955433,
            -179.162398654081,
        ),
        (
            ALBERT,
            1.0,
            40,
            0.28655926089492551,
            39.3106448602912,
            (3.08293336832587, 0.28672744),
            (0.893350873911053, 0.11306367),
            -206.504638420681,
            -176.093941763168,
        ),
    ],
)
def test_coal(counts, shape, mode, probability, mean, before, after, log_none, log_one):
    """Mode 41 = 1891: Carlin, Gelfand & Smith, Applied Statistics 41 (1992) 389-405 (from memory)."""
    said = single_change(counts, PoissonGamma(shape, 1.0))
    assert said.mode == mode
    assert said.probability[mode - 1] == pytest.approx(probability, abs=1e-11)
    assert said.mean == pytest.approx(mean, abs=1e-9)
    assert (said.level_before.mean, said.level_before.sd) == pytest.approx(before, abs=1e-8)
    assert (said.level_after.mean, said.level_after.sd) == pytest.approx(after, abs=1e-8)
    assert said.log_evidence_none == pytest.approx(log_none, abs=1e-9)
    assert said.log_evidence_one == pytest.approx(log_one, abs=1e-9)
    assert said.log_bayes_factor == pytest.approx(log_one - log_none, abs=1e-9)


def test_the_dates_of_coal_are_not_an_interval():
    """95 %: 1886 to 1893 and 1896, of mass 0.9561936008; quantiles 1886, 1890, 1896."""
    said = single_change(COAL, PoissonGamma(1.0, 1.0))
    assert [1850 + k for k in said.dates] == [*range(1886, 1894), 1896]
    assert said.dates_probability == pytest.approx(0.9561936008, abs=1e-9)
    assert [1850 + k for k in said.quantiles] == [1886, 1890, 1896]
    assert [round(said.probability[k - 1], 9) for k in (40, 39, 42, 37)] == [
        0.184760331,
        0.143162982,
        0.098807108,
        0.093141003,
    ]


class RandomRate(PoissonGamma):
    """Levels Gamma(1/2, rate b), b with density exp(-b) / b: together 1 / sqrt(x (1 + x))."""

    def log_density(self, level):
        return -0.5 * (np.log(level) + np.log1p(level))


def test_coal_under_the_hierarchy_of_carlin_gelfand_and_smith():
    """Applied Statistics 41 (1992) 389-405: the posterior of k gathers on 39, 40, 41, mode 41 (from memory).

    The figures are exact ones under their hierarchy, recomputed with Tricomi's function.
    """
    said = single_change(COAL, WithOneOffs(RandomRate(), share=0.0))
    assert said.mode == 41
    assert [said.probability[k - 1] for k in (41, 40, 39, 37, 42)] == pytest.approx(
        [0.240464866924, 0.185315609639, 0.146916574182, 0.100422129532, 0.0936375144953], abs=1e-9
    )
    assert said.mean == pytest.approx(39.9218160110914, abs=1e-7)
    assert said.level_before.mean == pytest.approx(3.12414590457155, abs=1e-8)
    assert said.level_after.mean == pytest.approx(0.926566196614528, abs=1e-8)


def test_coal_lies_near_rizzos_sampler():
    """Rizzo, Statistical Computing with R (2007): her sampler printed 39.935, 3.108575 and 0.9341033."""
    said = single_change(COAL, WithOneOffs(RandomRate(), share=0.0))
    assert said.mean == pytest.approx(39.935, abs=0.02)
    assert said.level_before.mean == pytest.approx(3.108575, abs=0.02)
    assert said.level_after.mean == pytest.approx(0.9341033, abs=0.01)


@pytest.mark.parametrize(
    ("size", "probability", "log_factor"),
    [
        (20.0, 0.3415821291, 3.829780),
        (40.0, 0.6106443634, 16.411912),
        (60.0, 0.7876568288, 28.667342),
        (100.0, 0.9413076906, 51.948154),
    ],
)
def test_nile(size, probability, log_factor):
    """Change after 1898: Cobb, The problem of the Nile, Biometrika 65 (1978) 243-251."""
    said = single_change(column("nile.csv"), BetaNegativeBinomial(size))
    assert 1870 + said.mode == 1898
    assert said.probability[said.mode - 1] == pytest.approx(probability, abs=1e-9)
    assert said.log_bayes_factor == pytest.approx(log_factor, abs=1e-6)


def test_poisson_overstates_certainty_on_large_counts():
    counts = column("nile.csv")
    poisson = single_change(counts, PoissonGamma(1.0, 0.001))
    assert 1870 + poisson.mode == 1898
    assert poisson.log_bayes_factor == pytest.approx(639.792411, abs=1e-5)
    assert poisson.probability[27] == pytest.approx(1.0, abs=1e-9)
    clustered = single_change(counts, BetaNegativeBinomial(40.0))
    assert log_comparison(clustered, poisson) > 100.0
    assert log_comparison(poisson, clustered) == -log_comparison(clustered, poisson)


def test_drivers_killed_find_the_seat_belt_law():
    """UK drivers killed from 1975-01 (R's Seatbelts): the old level ends with 1983-01, P 0.5100897394."""
    counts = column("uk_drivers_killed.csv")
    said = single_change(counts, BetaNegativeBinomial(100.0))
    assert len(counts) == 120
    assert said.mode == 97
    assert said.probability[96] == pytest.approx(0.5100897394, abs=1e-9)
    assert said.probability[95] == pytest.approx(0.215572, abs=1e-6)
    assert said.log_bayes_factor == pytest.approx(6.218779, abs=1e-6)
    assert np.mean(counts[:97]) == pytest.approx(119.25773, abs=1e-5)


CAMPYLOBACTERIOSIS = """
2 3 4 1 6 9 12 8 5 7 11 9 6 6 9 6 12 8 7 5 10 12 12 9 12 8 9 14 5 5 9 14 8 10 16 13 12 10 7 9 6 8 6 4 6 6 11 8
10 11 13 5 6 3 4 8 2 7 12 12 14 12 7 7 8 7 7 3 5 5 10 7 8 13 13 11 12 6 8 4 7 6 9 14 11 11 15 22 17 5 10 12 16
6 16 11 13 15 20 55 47 28 16 21 15 9 19 20 16 14 24 16 33 19 21 18 10 17 12 15 19 18 9 8 25 17 13 21 11 12 10
13 5 7 13 17 16 21 16 9
"""


@pytest.mark.parametrize(
    ("size", "probability"), [(5.0, 0.1927830281), (10.0, 0.2589986721), (20.0, 0.3076418219)]
)
def test_campylobacteriosis(size, probability):
    """Counts: Ferland, Latour & Oraichi, J. Time Series Analysis 27 (2006) 923-942.

    A new level from t = 84: Fokianos & Fried, J. Time Series Analysis 31 (2010) 210-225.
    """
    counts = [int(word) for word in CAMPYLOBACTERIOSIS.split()]
    said = single_change(counts, BetaNegativeBinomial(size))
    assert said.mode == 83
    assert said.probability[82] == pytest.approx(probability, abs=1e-9)


def test_the_marginal_of_one_count_is_scipys():
    law = BetaNegativeBinomial(10.0, 4.0, 3.0)
    for count in (0, 1, 5, 50, 200):
        table = law.segments(np.array([float(count), 1.0]))
        assert math.exp(table.log_before[0]) == pytest.approx(
            stats.betanbinom.pmf(count, 10, 4, 3), rel=1e-10
        )


@pytest.mark.parametrize(
    "law",
    [
        PoissonGamma(1.0, 1.0),
        PoissonGamma(0.5, 0.01),
        BetaNegativeBinomial(20.0),
        BetaNegativeBinomial(2.0, 3.0, 0.5),
    ],
)
@pytest.mark.parametrize("counts", [COAL, column("nile.csv"), [0, 0, 0, 5, 0, 7, 9000]])
def test_quadrature_equals_the_closed_form(law, counts):
    exact, numerical = single_change(counts, law), single_change(counts, WithOneOffs(law, share=0.0))
    assert numerical.log_evidence_none == pytest.approx(exact.log_evidence_none, abs=1e-7)
    assert numerical.log_evidence_one == pytest.approx(exact.log_evidence_one, abs=1e-7)
    assert numerical.probability == pytest.approx(exact.probability, abs=1e-8)
    assert numerical.mode == exact.mode


def test_poisson_and_negative_binomial_compared_under_one_prior():
    """The evidence tells which law made the counts; a size without end is the Poisson law."""
    random = np.random.default_rng(9)
    poisson, clustered = random.poisson(60.0, 120), random.negative_binomial(5, 5 / 65, 120)
    level = {"shape": 1.0, "rate": 0.02}
    for counts, sign in ((poisson, 1.0), (clustered, -1.0)):
        as_poisson = single_change(counts.tolist(), PoissonGamma(**level))
        as_clustered = single_change(counts.tolist(), NegativeBinomialGamma(5.0, **level))
        assert sign * log_comparison(as_poisson, as_clustered) > 10.0
        limit = single_change(counts.tolist(), NegativeBinomialGamma(1e12, **level))
        assert log_comparison(as_poisson, limit) == pytest.approx(0.0, abs=1e-6)


def test_one_offs_do_not_make_a_change():
    """Invented counts; polio in November 1972 (Zeger, Biometrika 75 (1988) 621-629) is like them."""
    counts = [9, 11, 8, 10, 12, 9, 10, 8, 11, 10, 9, 300, 280, 10, 9, 12, 8, 10, 11, 9]
    law = PoissonGamma(1.0, 0.1)
    plain, with_one_offs = single_change(counts, law), single_change(counts, WithOneOffs(law))
    assert plain.log_bayes_factor > 100.0
    assert with_one_offs.log_bayes_factor < 0.0
    assert log_comparison(with_one_offs, plain) > 100.0


def test_a_change_is_found_beside_a_one_off():
    counts = [40, 38, 44, 41, 500, 39, 42, 40, 20, 19, 23, 21, 18, 22, 20, 21]
    said = single_change(counts, WithOneOffs(BetaNegativeBinomial(100.0)))
    assert said.mode == 8
    assert said.log_bayes_factor > 5.0


def test_ties_go_to_the_later_date():
    said = single_change([5, 5, 5, 5, 5], PoissonGamma(1.0, 1.0), share=0.3)
    assert said.probability[0] == pytest.approx(said.probability[3])
    assert said.mode == 4
    assert said.dates[-1] == 4


def test_bad_input():
    law = PoissonGamma()
    with pytest.raises(UnusableParameter, match="at least two counts; got 1"):
        single_change([3], law)
    with pytest.raises(UnusableObservation):
        single_change([3, -1], law)
    with pytest.raises(UnusableParameter, match="share"):
        single_change([3, 1], law, share=0.0)
    with pytest.raises(UnusableParameter, match="size must be below"):
        single_change([10**9] * 200, WithOneOffs(law))
    with pytest.raises(UnusableParameter):
        BetaNegativeBinomial(0.0)
