"""Rounding by the width of the interval: nothing is claimed that is not known, nothing known is lost."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.tell.rounding import Between, rounded, step_of


@pytest.mark.parametrize(
    ("value", "low", "high", "words"),
    [
        (1047.3, 1010, 1085, "1,050"),
        (1047.3, 1046, 1049, "1,050"),
        (1047.3, 500, 2000, "1,000"),
        (636, 590, 690, "640"),
        (0.41, 0.3, 0.55, "0.40"),
        (0.0031, 0.001, 0.02, "0.003"),
        (3, 0.1, 40, "3"),
        (9.96, 9, 11, "10.0"),
        (987_654_321, 9e8, 1.1e9, "1,000,000,000"),
        (0, 0, 3, "0"),
        (5, 5, 5, "5.00"),
        (5, 1, math.inf, "5.00"),
        (math.nan, 1, 2, "unknown"),
        (math.inf, 1, 2, "unknown"),
        (1.797e308, 1.797e308, 1.797e308, "unknown"),
        (-39.2, -45, -33, "-39"),
    ],
)
def test_examples(value: float, low: float, high: float, words: str) -> None:
    assert rounded(Between(value, low, high)) == words


FIGURES = st.builds(
    lambda value, below, above: Between(value, value * (1 - below), value * (1 + above)),
    st.floats(1e-6, 1e12),
    st.floats(0, 1),
    st.floats(0, 100),
)


@given(FIGURES)
def test_rounding_moves_a_figure_by_at_most_an_eighth_of_its_width(figure: Between) -> None:
    moved = abs(float(rounded(figure).replace(",", "")) - figure.value)
    at_three_digits = 0.005 * 10 ** math.ceil(math.log10(figure.value) + 1e-9)
    assert moved <= max((figure.high - figure.low) / 8, at_three_digits) * 1.000001


@given(FIGURES)
def test_no_figure_is_rounded_away(figure: Between) -> None:
    assert float(rounded(figure).replace(",", "")) > 0


@given(FIGURES, st.floats(1.2, 1000))
def test_two_figures_that_differ_are_never_written_alike(figure: Between, times: float) -> None:
    other = Between(figure.value * times, figure.low, figure.high * times)
    finest = other.value - figure.value
    assert rounded(figure, finest=finest) != rounded(other, finest=finest)


@given(FIGURES)
def test_the_step_is_one_or_five_times_a_power_of_ten(figure: Between) -> None:
    step = step_of(figure)
    digit = step / 10 ** math.floor(math.log10(step) + 1e-9)
    assert min(abs(digit - 1), abs(digit - 5)) < 1e-6
