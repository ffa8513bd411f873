"""The model's parameters, all in one frozen value."""

import math
from dataclasses import dataclass, field
from typing import Literal

from detectors.accuracy import Accuracy
from detectors.errors import UnusableParameter
from detectors.gap_prior import GapPrior
from detectors.jump_prior import IndependentLevels, JumpPrior

MODEL_VERSION = 1
"""Raised whenever the same readings and settings would give other posteriors."""

DISPERSIONS = (0.5, 1.0, *(2.0 ** (step / 2) for step in range(1, 13)), 128.0, 256.0, 512.0, math.inf)
"""Steps of the square root of 2 where audiences lie, wider ones beyond."""
WANDERS = ((0.01, 1.0), (0.03, 0.1), (0.1, 0.02), (0.3, 0.005))
"""Half a per cent or so of the level per count is never ruled out: no audience stands quite still."""


@dataclass(frozen=True, slots=True)
class Model:
    """What the filter assumes of a stream.

    Attributes
    ----------
    gap : GapPrior
        Prior of the length of a run.
    one_off_share : float
        Prior probability that a count is a one-off, at least 0 and below 1.
    one_off_tail : float
        Tail exponent of the one-off component, above 0.
    jump : JumpPrior or IndependentLevels
        How the level of a new run depends on the level before it.
    dispersions : tuple of float
        Values considered for the dispersion, each equally likely beforehand; infinity is the Poisson limit.
    wanders : tuple of (float, float)
        Values considered for the wander per unit of position, each with its prior weight.
    first_run : {"equilibrium", "ordinary"}
        Whether the first run was joined at a random moment of its life, or began with the first count.
    accuracy : Accuracy
        The numerical choices.
    """

    gap: GapPrior = field(default_factory=lambda: GapPrior(shape=2, mean=150.0))
    one_off_share: float = 0.02
    one_off_tail: float = 1.0
    jump: JumpPrior | IndependentLevels = field(default_factory=JumpPrior)
    dispersions: tuple[float, ...] = DISPERSIONS
    wanders: tuple[tuple[float, float], ...] = WANDERS
    first_run: Literal["equilibrium", "ordinary"] = "equilibrium"
    accuracy: Accuracy = field(default_factory=Accuracy)

    def __post_init__(self) -> None:
        if not 0.0 <= self.one_off_share < 1.0:
            raise UnusableParameter("one_off_share", self.one_off_share, "at least 0 and below 1")
        if not 0.0 < self.one_off_tail < math.inf:
            raise UnusableParameter("one_off_tail", self.one_off_tail, "a finite number above 0")
        if not self.dispersions or any(not r > 0.0 for r in self.dispersions):
            raise UnusableParameter("dispersions", self.dispersions, "one or more numbers above 0")
        if not self.wanders or any(not (0.0 <= w <= 1.0 and weight > 0.0) for w, weight in self.wanders):
            raise UnusableParameter(
                "wanders", self.wanders, "one or more (value from 0 to 1, weight above 0)"
            )
