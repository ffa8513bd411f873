"""From readings to a triangle: cells between readings, restatements, and factors through polls."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from detectors.development_check import robust_chain_ladder
from detectors.development_fraction import Fraction, fraction_for
from detectors.errors import UnusableObservation, UnusableParameter
from detectors.growth_triangle import Growth, build_triangle

FloatArray = NDArray[np.float64]


@st.composite
def growths(draw: st.DrawFn) -> Growth:
    gaps = draw(st.lists(st.floats(0.01, 3.0), min_size=1, max_size=12))
    rises = draw(st.lists(st.integers(0, 500), min_size=len(gaps), max_size=len(gaps)))
    return Growth(tuple(np.cumsum(gaps).tolist()), tuple(np.cumsum(rises).tolist()))


@given(growths(), st.floats(0.1, 8.0))
@settings(max_examples=80, deadline=None)
def test_cells_lie_between_the_readings_beside_them(growth: Growth, age: float) -> None:
    ages = sorted({age, age + 0.5, *growth.ages})
    cells = build_triangle([growth], ages, widest_gap=1e9).counts[0]
    for cell, at in zip(cells, ages, strict=True):
        if at in growth.ages:
            assert cell == growth.counts[growth.ages.index(at)]
        elif growth.ages[0] < at < growth.ages[-1]:
            after = int(np.searchsorted(growth.ages, at))
            assert growth.counts[after - 1] - 1e-6 <= cell <= growth.counts[after] + 1e-6
        else:
            assert np.isnan(cell)
    known = cells[~np.isnan(cells)]
    assert (np.diff(known) >= -1e-6).all()


def test_readings_too_far_apart_tell_no_cell() -> None:
    growth = Growth(ages=(1.0, 5.0, 9.0), counts=(10, 50, 60))
    assert np.isnan(build_triangle([growth], ages=(3.0, 7.0)).counts[0]).tolist() == [True, False]


def test_a_restated_release_keeps_only_what_was_counted_in_the_new_way() -> None:
    growth = Growth(ages=(1.0, 2.0, 3.0, 4.0), counts=(100, 200, 120, 150))
    told = build_triangle([growth], ages=(1.0, 2.0, 3.0, 4.0))
    assert np.isnan(told.counts[0]).tolist() == [True, True, False, False]
    (fall,) = told.restated
    assert (fall.age_before, fall.age_after, fall.count_before, fall.count_after) == (2.0, 3.0, 200, 120)
    # A correction of less than a hundredth stays in one counting, and is listed all the same.
    small = build_triangle([Growth((1.0, 2.0, 3.0), (100, 1000, 995))], ages=(1.0, 2.0, 3.0))
    assert small.counts[0].tolist() == [100.0, 1000.0, 995.0]
    assert len(small.restated) == 1


def test_the_newest_rows_keep_their_falls() -> None:
    told = build_triangle([Growth((1.0,), (5,)), Growth((1.0, 2.0), (9, 4))], ages=(1.0, 2.0))
    newest = told.newest(1)
    assert newest.counts.shape == (1, 2)
    assert newest.restated[0].row == 0


@pytest.mark.parametrize("ages", [(), (0.0, 1.0), (2.0, 1.0), (1.0, math.inf)])
def test_stated_ages_must_ascend(ages: tuple[float, ...]) -> None:
    with pytest.raises(UnusableParameter):
        build_triangle([], ages)


def test_readings_must_ascend() -> None:
    with pytest.raises(UnusableObservation):
        Growth((2.0, 2.0), (1, 2))
    with pytest.raises(UnusableObservation):
        Growth((1.0,), (-1,))


def share_at(age: FloatArray) -> FloatArray:
    return 1.0 - 0.6 * np.exp(-age / 1.2) - 0.4 * np.exp(-age / 6.0)


def polled(releases: int, random: np.random.Generator) -> list[Growth]:
    """Weekly releases, polled about every nine hours from day 60 on."""
    polls = 60.0 + np.cumsum(random.uniform(0.1, 0.65, 400))
    out = []
    for number in range(releases):
        age = polls - 7.0 * number
        age = age[age >= 0.0]
        total = random.gamma(8.0, 1 / 8.0) * 20_000.0
        counts = np.cumsum(random.poisson(total * np.diff(share_at(age), prepend=0.0)))
        out.append(Growth(tuple(age.tolist()), tuple(counts.tolist())))
    return out


def test_through_polls() -> None:
    ages = (1.0, 3.0, 7.0, 30.0)
    cells = build_triangle(polled(30, np.random.default_rng(5)), ages)
    known = ~np.isnan(cells.counts)
    # Day 60 meets release 8 at an age of 4 days, release 9 before it is out; polls end near day 210.
    assert not known[:9, 0].any()
    assert known[9:, 0].all()
    assert known[5:21, 3].all()
    development = robust_chain_ladder(cells)
    assert development.steps[0].rows == known[9:, 1].sum()
    whole = share_at(np.array([30.0]))[0]
    for age in (1.0, 2.0, 3.0, 7.0):
        told = fraction_for(development, None, age)
        assert isinstance(told, Fraction)
        # Ten thousand and more counts a cell, twelve rows and more: half a per cent of chance. Between the
        # stated ages the curve's form is not known.
        assert told.fraction == pytest.approx(
            share_at(np.array([age]))[0] / whole, rel=0.01 if age in ages else 0.03
        )
