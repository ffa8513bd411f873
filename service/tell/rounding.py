"""Numbers rounded as their uncertainty deserves. Pure.

A figure is rounded to a step of 1 or 5 times a power of ten that is at most a quarter of the width of its
interval, so that rounding moves it by at most an eighth of that width. It keeps at least its first digit, and
is given no more than three.
"""

import math
from dataclasses import dataclass

SHARE_OF_WIDTH = 0.25
FIRST_TO_THIRD_DIGIT = 100.0
# A level below this is none: one count in a billion intervals.
NOTHING = 1e-9
UNITS = (5.0, 1.0)


@dataclass(frozen=True, slots=True)
class Between:
    """A figure and the interval it lies in."""

    value: float
    low: float
    high: float


def rounded(figure: Between, *, finest: float = math.inf) -> str:
    """The figure in words, with commas between thousands.

    `finest` is a difference that must stay to be seen: the step is at most a quarter of it.
    """
    if not math.isfinite(figure.value):
        return "unknown"
    if abs(figure.value) < NOTHING:
        return "0"
    step = step_of(figure, finest=finest)
    decimals = max(0, -math.floor(math.log10(step) + 1e-9))
    shown = round(figure.value / step) * step
    # The largest floats round up to infinity.
    return f"{shown:,.{decimals}f}" if math.isfinite(shown) else "unknown"


def step_of(figure: Between, *, finest: float = math.inf) -> float:
    """The step to which a figure other than 0 is rounded."""
    first_digit = math.pow(10.0, math.floor(math.log10(abs(figure.value))))
    third_digit = first_digit / FIRST_TO_THIRD_DIGIT
    width = figure.high - figure.low
    wanted = min(width if math.isfinite(width) else 0.0, finest) * SHARE_OF_WIDTH
    return min(max(_at_most(wanted), third_digit), first_digit)


def _at_most(wanted: float) -> float:
    """The largest step of 1 or 5 times a power of ten that is not above what is wanted; 0 for none."""
    if wanted <= 0:
        return 0.0
    power = math.pow(10.0, math.floor(math.log10(wanted)))
    return next((unit * power for unit in UNITS if unit * power <= wanted), power)
