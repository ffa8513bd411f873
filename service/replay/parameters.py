"""The model and the rule from what a person says of them. Pure."""

import math
from dataclasses import dataclass, replace
from typing import TypeVar
from zoneinfo import ZoneInfo

from detectors.errors import UnusableParameter
from detectors.gap_prior import GapPrior
from detectors.judge import Rule
from detectors.jump_prior import JumpPrior
from detectors.model import Model
from service.accuracy import accuracy_for

POISSON = "poisson"

Value = TypeVar("Value")


@dataclass(frozen=True, slots=True)
class Wish:
    """What was asked for; None leaves the default as it is. `smallest_shift` 0.15 is 15 %."""

    threshold: float | None = None
    window: int | None = None
    lasting: int | None = None
    fewest_counts: int | None = None
    mean_gap: float | None = None
    gap_shape: int | None = None
    smallest_shift: float | None = None
    one_off_share: float | None = None
    wanders: tuple[tuple[float, float], ...] | None = None
    dispersions: tuple[float, ...] | None = None


def model_for(wish: Wish) -> Model:
    """The default model with the wishes put in.

    Raises
    ------
    UnusableParameter
        If one of them lies outside its range.
    """
    plain = Model()
    gap = GapPrior(shape=_or(wish.gap_shape, plain.gap.shape), mean=_or(wish.mean_gap, plain.gap.mean))
    return replace(
        plain,
        gap=gap,
        jump=plain.jump if wish.smallest_shift is None else _jump(wish.smallest_shift),
        one_off_share=_or(wish.one_off_share, plain.one_off_share),
        wanders=_or(wish.wanders, plain.wanders),
        dispersions=_or(wish.dispersions, plain.dispersions),
        accuracy=accuracy_for(_or(wish.window, Rule().window)),
    )


def rule_for(wish: Wish) -> Rule:
    """The default rule with the wishes put in.

    Raises
    ------
    UnusableParameter
        If one of them lies outside its range.
    """
    plain = Rule()
    return Rule(
        threshold=_or(wish.threshold, plain.threshold),
        window=_or(wish.window, plain.window),
        lasting=_or(wish.lasting, plain.lasting),
        fewest_counts=_or(wish.fewest_counts, plain.fewest_counts),
    )


def read_zone(text: str) -> ZoneInfo:
    """A zone by its name in the IANA database.

    Raises
    ------
    UnusableParameter
        If there is none of that name.
    """
    try:
        return ZoneInfo(text)
    except (ValueError, OSError, KeyError):
        raise UnusableParameter("zone", text, "a zone of the IANA database such as Europe/Berlin") from None


def read_dispersions(text: str) -> tuple[float, ...]:
    """Dispersions from a list such as "4,16,poisson"; the word stands for infinity, the Poisson limit.

    Raises
    ------
    UnusableParameter
        If it is none.
    """
    parts = ("inf" if part.strip() == POISSON else part for part in text.split(","))
    values = tuple(_number("dispersion", part) for part in parts)
    if len(set(values)) < len(values):
        raise UnusableParameter("dispersion", text, "a list of different numbers")
    return values


def read_wanders(text: str) -> tuple[tuple[float, float], ...]:
    """Wanders with their prior weights from a list such as "0" or "0.005:1,0.01:0.5"; a weight left out is 1.

    Raises
    ------
    UnusableParameter
        If it is none.
    """
    pairs = tuple(_weighted(part) for part in text.split(","))
    if len({value for value, _ in pairs}) < len(pairs):
        raise UnusableParameter("wander", text, "a list of different values")
    return pairs


def _weighted(part: str) -> tuple[float, float]:
    value, _, weight = part.partition(":")
    return _number("wander", value), _number("wander", weight or "1")


def _number(name: str, text: str) -> float:
    try:
        number = float(text)
    except ValueError:
        number = math.nan
    if math.isnan(number):
        raise UnusableParameter(name, text, "a list of numbers with commas between them")
    return number


def _or(wished: Value | None, plain: Value) -> Value:
    return plain if wished is None else wished


def _jump(smallest_shift: float) -> JumpPrior:
    if not 0.0 <= smallest_shift < math.inf:
        raise UnusableParameter(
            "smallest_shift", smallest_shift, "a share of at least 0, such as 0.15 for 15 %"
        )
    return JumpPrior(smallest=math.log1p(smallest_shift))
