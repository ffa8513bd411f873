"""Growing counts: the triangle from readings, the chain ladder against published figures, fractions.

Sources. TAYLOR_ASHE: Taylor & Ashe (1983), Second moments of estimates of outstanding claims, J. Econometrics
23, 37-61; its factors, reserves and standard errors by the method of Mack (1993), ASTIN Bulletin 23, 213-225,
as England & Verrall (2002), British Actuarial Journal 8, print them (94,634 ... total 18,680,856, standard
error 2,447,095). RAA: the triangle of Mack (1994) in the CAS Forum. More digits than printed, and all figures
of RAA, were recomputed with the package chainladder 0.10.1, `sigma_interpolation="mack"` (its default, a
log-linear rule for the last variance, gives 2,441,364 instead).
"""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from detectors.development import Development, Step, WholeWay, chain_ladder
from detectors.development_check import median_check, one_off_growth, robust_chain_ladder
from detectors.development_fraction import Evidence, Fraction, expected_fraction
from detectors.development_ultimate import ultimates
from detectors.growth_triangle import Triangle

TAYLOR_ASHE = [
    [357848, 1124788, 1735330, 2218270, 2745596, 3319994, 3466336, 3606286, 3833515, 3901463],
    [352118, 1236139, 2170033, 3353322, 3799067, 4120063, 4647867, 4914039, 5339085],
    [290507, 1292306, 2218525, 3235179, 3985995, 4132918, 4628910, 4909315],
    [310608, 1418858, 2195047, 3757447, 4029929, 4381982, 4588268],
    [443160, 1136350, 2128333, 2897821, 3402672, 3873311],
    [396132, 1333217, 2180715, 2985752, 3691712],
    [440832, 1288463, 2419861, 3483130],
    [359480, 1421128, 2864498],
    [376686, 1363294],
    [344014],
]
RAA = [
    [5012, 8269, 10907, 11805, 13539, 16181, 18009, 18608, 18662, 18834],
    [106, 4285, 5396, 10666, 13782, 15599, 15496, 16169, 16704],
    [3410, 8992, 13873, 16141, 18735, 22214, 22863, 23466],
    [5655, 11555, 15766, 21266, 23425, 26083, 27067],
    [1092, 9565, 15836, 22169, 25955, 26180],
    [1513, 6445, 11702, 12935, 15852],
    [557, 4020, 10946, 12314],
    [1351, 6947, 13112],
    [3133, 5395],
    [2063],
]
LEAST = Evidence(rows=2, counts=1)
FloatArray = NDArray[np.float64]


def triangle(rows: list[list[int]]) -> Triangle:
    width = max(map(len, rows))
    counts = np.array([[*row, *[math.nan] * (width - len(row))] for row in rows], dtype=np.float64)
    return Triangle(tuple(float(age) for age in range(1, width + 1)), counts)


def grown(shares: list[float], totals: list[float]) -> Triangle:
    """A complete triangle of releases that all grow by the same shares."""
    return Triangle(tuple(float(k + 1) for k in range(len(shares))), np.outer(totals, shares))


def test_taylor_ashe_factors_and_variances() -> None:
    steps = chain_ladder(triangle(TAYLOR_ASHE)).steps
    assert [step.factor for step in steps] == pytest.approx(
        [
            3.4906065479322863,
            1.7473326421004893,
            1.4574128360182361,
            1.1738517093997867,
            1.1038235322443440,
            1.0862693644363943,
            1.0538743555048127,
            1.0765551783529383,
            1.0177247252195440,
        ],
        rel=1e-13,
    )
    assert [step.variance for step in steps] == pytest.approx(
        [
            160280.32748048689,
            37736.855047996374,
            41965.213017424040,
            15182.902680976436,
            13731.323891978891,
            8185.7716200096330,
            446.61655010535200,
            1147.3659684286617,
            446.61655010535200,  # one row only: Mack's rule
        ],
        rel=1e-11,
    )
    assert [step.rows for step in steps] == [9, 8, 7, 6, 5, 4, 3, 2, 1]


def test_taylor_ashe_reserves_and_standard_errors() -> None:
    cells = triangle(TAYLOR_ASHE)
    told = ultimates(cells, chain_ladder(cells))
    assert [round(row.reserve) for row in told.rows] == [
        *(0, 94634, 469511, 709638, 984889),
        *(1419459, 2177641, 3920301, 4278972, 4625811),
    ]
    assert [round(row.standard_error) for row in told.rows] == [
        *(0, 75535, 121699, 133549, 261406),
        *(411010, 558317, 875328, 971258, 1363155),
    ]
    assert told.reserve == pytest.approx(18680855.611924306, rel=1e-13)
    assert told.standard_error == pytest.approx(2447094.860834665, rel=1e-13)
    shares = [row.latest / row.ultimate for row in reversed(told.rows)]
    assert shares == pytest.approx(
        [
            *(0.06922055025, 0.24162170596, 0.42219349386, 0.61531021724, 0.72228295031),
            *(0.79727291750, 0.86605314537, 0.91271120041, 0.98258396914, 1.0),
        ],
        abs=1e-10,
    )


def test_raa() -> None:
    cells = triangle(RAA)
    development = chain_ladder(cells)
    told = ultimates(cells, development)
    assert [step.factor for step in development.steps] == pytest.approx(
        [
            *(2.99935865, 1.62352275, 1.27088812, 1.17167463, 1.11338489),
            *(1.04193464, 1.03326355, 1.01693648, 1.00921659),
        ],
        abs=1e-8,
    )
    reserves = [153.954, 617.371, 1636.142, 2746.736, 3649.103, 5435.303, 10907.193, 10649.984, 16339.443]
    errors = [206.220, 623.377, 747.175, 1469.457, 2001.857, 2209.242, 5357.869, 6333.166, 24566.288]
    assert [row.reserve for row in told.rows[1:]] == pytest.approx(reserves, abs=1e-3)
    assert [row.standard_error for row in told.rows[1:]] == pytest.approx(errors, abs=1e-3)
    assert told.standard_error == pytest.approx(26909.011156, abs=1e-6)


@pytest.mark.parametrize("rows", [TAYLOR_ASHE, RAA])
def test_a_fraction_has_macks_error_at_the_release_s_own_size(rows: list[list[int]]) -> None:
    # The last step rests on one row; its rule-made variance is used here to reach Mack's figures.
    cells = triangle(rows)
    development = chain_ladder(cells)
    one_row = Step(**{name: getattr(development.steps[-1], name) for name in Step.__slots__} | {"rows": 2})
    steps = (*development.steps[:-1], one_row)
    for row in ultimates(cells, development).rows[2:]:
        told = expected_fraction(
            Development(development.ages, steps), row.latest_place + 1.0, size=row.latest, evidence=LEAST
        )
        assert isinstance(told, Fraction)
        assert told.fraction == pytest.approx(row.latest / row.ultimate, rel=1e-12)
        assert told.process_sd == pytest.approx(row.process_error / row.ultimate, rel=1e-12)
        assert told.parameter_sd == pytest.approx(row.parameter_error / row.ultimate, rel=1e-12)
        assert told.standard_error == pytest.approx(row.standard_error / row.ultimate, rel=1e-12)


def test_missing_early_cells_by_hand() -> None:
    # Old releases first seen at the second age: only rows with both cells known make a factor.
    cells = np.array([[np.nan, 60.0, 66.0], [10.0, 20.0, 22.0], [30.0, 54.0, np.nan]])
    first, second = chain_ladder(Triangle((1.0, 3.0, 7.0), cells)).steps
    assert (first.factor, first.rows, first.counts, first.size) == (74 / 40, 2, 40.0, 20.0)
    assert first.variance == pytest.approx(10 * 0.15**2 + 30 * 0.05**2)
    assert first.standard_error == pytest.approx(math.sqrt(0.3 / 40))
    assert (second.factor, second.rows) == (88 / 80, 2)


def test_a_row_that_began_at_nothing_counts_in_the_sum() -> None:
    # Quotient of sums 40 / 20; without the row of 0 it would be 1.75.
    cells = np.array([[10.0, 20.0], [10.0, 15.0], [0.0, 5.0]])
    (step,) = chain_ladder(Triangle((1.0, 7.0), cells)).steps
    assert (step.factor, step.rows) == (2.0, 2)


@given(st.floats(1e-3, 1e6), st.permutations(range(8)))
@settings(max_examples=30, deadline=None)
def test_factors_know_neither_unit_nor_order(unit: float, order: list[int]) -> None:
    cells = triangle(TAYLOR_ASHE[:8])
    plain = chain_ladder(cells)
    other = chain_ladder(Triangle(cells.ages, unit * cells.counts[order]))
    for one, two in zip(plain.steps, other.steps, strict=True):
        assert one.factor == pytest.approx(two.factor, rel=1e-12)
        if one.variance is not None and two.variance is not None:
            assert unit * one.variance == pytest.approx(two.variance, rel=1e-8)


def one_viral(late: float) -> Triangle:
    """Twenty releases that grow by 2 give or take 10 %, and one of ten times their size."""
    random = np.random.default_rng(3)
    first = random.integers(800, 1200, 20).astype(float)
    later = first * 2.0 * np.exp(random.normal(0.0, 0.1, 20))
    return Triangle(
        (1.0, 7.0), np.column_stack([np.append(first, 10_000.0), np.append(later, 10_000.0 * late)])
    )


def test_one_viral_release_bends_the_sums_and_is_found() -> None:
    bent = one_viral(late=20.0)
    (odd,) = one_off_growth(bent)
    assert (odd.row, odd.step, odd.factor) == (20, 0, 20.0)
    plain, robust = chain_ladder(bent), robust_chain_ladder(bent)
    assert plain.steps[0].factor == pytest.approx(8.0, rel=0.05)
    assert robust.steps[0].factor == pytest.approx(2.0, rel=0.05)
    assert robust.left_out == ((20, 0),)
    (before,), (after,) = median_check(bent, plain), median_check(bent, robust)
    assert before.disagrees
    assert not after.disagrees
    assert before.heaviest_share == pytest.approx(1 / 3, abs=0.02)


def test_a_large_release_that_grows_like_the_others_is_not_odd() -> None:
    assert one_off_growth(one_viral(late=2.1)) == ()


def test_a_small_odd_release_hardly_moves_a_factor_from_sums() -> None:
    # RAA's second row begins at 106 and grows by 40, the other eight by 2 to 9: too wide a spread to call it
    # odd (score below 4.5), and no harm done, since it weighs 106. A mean of the rows' factors would be 8.2.
    cells = triangle(RAA)
    factors = cells.counts[:9, 1] / cells.counts[:9, 0]
    assert factors.max() == pytest.approx(40.4, abs=0.1)
    assert factors.mean() == pytest.approx(8.2, abs=0.05)
    assert all(odd.step > 0 for odd in one_off_growth(cells))
    without = chain_ladder(cells, left_out=[(1, 0)]).steps[0].factor
    assert without == pytest.approx(2.99935865, rel=0.07)
    # The second row's step from 5,396 to 10,666, where the others grow by 1.1 to 1.4, is called odd.
    assert [(odd.row, odd.step) for odd in one_off_growth(cells)] == [(1, 2)]


def test_one_off_growth_is_rare_where_there_is_none() -> None:
    random = np.random.default_rng(9)
    found = 0
    for _ in range(200):
        first = random.poisson(50.0, 30).astype(float)
        later = first + random.poisson(40.0, 30)
        found += len(one_off_growth(Triangle((1.0, 7.0), np.column_stack([first, later]))))
    # 6000 releases; measured: none.
    assert found <= 3


def test_a_way_taken_whole_by_hand() -> None:
    cells = np.array([[10.0, 20.0, 40.0], [30.0, 54.0, 60.0]])
    first = chain_ladder(Triangle((1.0, 2.0, 3.0), cells)).whole_ways[0]
    # f = 100 / 40; sigma^2 = 10 (4 - 2.5)^2 + 30 (2 - 2.5)^2 = 30; over f^2 and the size of 20.
    assert first == WholeWay(rows=2, size=20.0, relative_variance=pytest.approx(30.0 / 6.25 / 20.0))
