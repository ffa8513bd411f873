"""How much a level moved, in words: a share for falls and small rises, so many times for large ones. Pure."""

import math

from detectors.posterior import Quantiles
from service.tell.rounding import NOTHING, SHARE_OF_WIDTH, Between, rounded

SMALLEST_SHARE = 0.01
TIMES_FROM = 2.0


def effect_words(before: Quantiles, after: Quantiles) -> str:
    """Such as "fell by about 40 %" or "rose to about 90 times what it was"."""
    if not _usable(before) or not _usable(after):
        return "moved"
    if before.mid < NOTHING or after.mid < NOTHING:
        return _from_or_to_nothing(before.mid, after.mid)
    ratio = after.mid / before.mid
    if abs(ratio - 1) < SMALLEST_SHARE:
        return "moved by less than 1 %"
    if ratio >= TIMES_FROM:
        return f"rose to about {rounded(_times(before, after))} times what it was"
    if ratio < SMALLEST_SHARE:
        return "fell by more than 99 %"
    return f"{'fell' if ratio < 1 else 'rose'} by about {rounded(_percent(before, after))} %"


def levels_words(before: Quantiles, after: Quantiles) -> str:
    """Such as "from about 1,050 to about 640"; the two never read alike unless they are."""
    difference = abs(after.mid - before.mid)
    finest = difference if math.isfinite(difference) and difference > 0 else math.inf
    return f"from {_level(before, finest)} to {_level(after, finest)}"


def _from_or_to_nothing(before: float, after: float) -> str:
    if before < NOTHING and after < NOTHING:
        return "moved"
    return "rose from nothing" if before < NOTHING else "fell to nothing"


def _level(level: Quantiles, finest: float) -> str:
    words = rounded(Between(level.mid, level.low, level.high), finest=finest)
    return words if words in ("0", "unknown") else f"about {words}"


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
    return math.isfinite(level.mid) and level.mid >= 0
