"""How much a level moved, in words: a share for falls and small rises, so many times for large ones. Pure.

A level that reaches down to the lowest one that can be told apart is known from above only: it is written as
"under" its 95 % quantile, and no ratio is made of it.
"""

import math

from detectors.posterior import Quantiles
from detectors.spacing import LOWEST_LEVEL
from service.tell.rounding import SHARE_OF_WIDTH, Between, rounded

SMALLEST_SHARE = 0.01
TIMES_FROM = 2.0
BOUNDED_BELOW = 2 * LOWEST_LEVEL


def moved_words(before: Quantiles, after: Quantiles) -> str:
    """Such as "fell by about 40 %, from about 1,050 to about 640" or "fell from about 1,050 to under 1.1"."""
    levels = _levels_words(before, after)
    if known_from_above(before) or known_from_above(after):
        return f"{_direction(before, after)} {levels}"
    return f"{_effect_words(before, after)}, {levels}"


def _effect_words(before: Quantiles, after: Quantiles) -> str:
    """Such as "fell by about 40 %" or "rose to about 90 times what it was"."""
    if not _usable(before) or not _usable(after):
        return "moved"
    ratio = after.mid / before.mid
    if abs(ratio - 1) < SMALLEST_SHARE:
        return "moved by less than 1 %"
    if ratio >= TIMES_FROM:
        return f"rose to about {rounded(_times(before, after))} times what it was"
    if ratio < SMALLEST_SHARE:
        return "fell by more than 99 %"
    return f"{'fell' if ratio < 1 else 'rose'} by about {rounded(_percent(before, after))} %"


def _levels_words(before: Quantiles, after: Quantiles) -> str:
    """Such as "from about 1,050 to about 640"; the two never read alike unless they are."""
    difference = abs(after.mid - before.mid)
    finest = difference if math.isfinite(difference) and difference > 0 else math.inf
    return f"from {_level(before, finest)} to {_level(after, finest)}"


def _direction(before: Quantiles, after: Quantiles) -> str:
    """Which way it went, where one level is a bound; of two bounds nobody can say."""
    if known_from_above(before) and known_from_above(after):
        return "moved"
    if known_from_above(after):
        return "fell" if after.mid < before.mid else "moved"
    return "rose" if before.mid < after.mid else "moved"


def known_from_above(level: Quantiles) -> bool:
    """Whether the level reaches down to the lowest ones that are told apart."""
    # Tenfold, since a bound is rounded up.
    return level.low <= BOUNDED_BELOW and math.isfinite(10 * level.high)


def _level(level: Quantiles, finest: float) -> str:
    if known_from_above(level):
        return under_words(level)
    words = rounded(Between(level.mid, level.low, level.high), finest=finest)
    return words if words == "unknown" else f"about {words}"


def under_words(level: Quantiles) -> str:
    """Such as "under 1.1": two digits, rounded up, since it is a bound."""
    value = max(level.high, LOWEST_LEVEL)
    step = math.pow(10.0, math.floor(math.log10(value)) - 1)
    decimals = max(0, -math.floor(math.log10(step) + 1e-9))
    return f"under {math.ceil(value / step - 1e-9) * step:,.{decimals}f}"


def _times(before: Quantiles, after: Quantiles) -> Between:
    ratio = after.mid / before.mid
    spread = _spread(before, after)
    return Between(ratio, ratio / spread, ratio * spread)


def _percent(before: Quantiles, after: Quantiles) -> Between:
    times = _times(before, after)
    width = 100 * (times.high - times.low)
    value = 100 * abs(times.value - 1)
    # Near 100 % what is left counts: a fall that leaves something never reads as one that leaves nothing.
    left = 100 - value if times.value < 1 else value
    shown = max(min(width, left / SHARE_OF_WIDTH), 1 / SHARE_OF_WIDTH)
    return Between(value, value - shown / 2, value + shown / 2)


def _spread(before: Quantiles, after: Quantiles) -> float:
    """The factor by which the ratio of the levels may be off either way, the two taken as independent."""
    halves = [_half_log_width(level) for level in (before, after)]
    return math.exp(min(math.hypot(*halves), 50.0))


def _half_log_width(level: Quantiles) -> float:
    return (math.log(level.high) - math.log(level.low)) / 2 if 0 < level.low < level.high < math.inf else 0.0


def _usable(level: Quantiles) -> bool:
    return math.isfinite(level.mid) and level.mid > 0
