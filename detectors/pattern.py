"""The recurring pattern of a calendar stream: factors of weekdays, months and known days."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

from detectors.observation import Observation


@dataclass(frozen=True, slots=True)
class PlaceFactor:
    """The factor of one place of a cycle, or of one kind of known day.

    Attributes
    ----------
    label : str
        The place.
    factor : float
        How counts there compare with the cycle's average (of a known day: with other days).
    relative_sd : float
        Relative standard error of the factor.
    counted : int
        Number of counts it rests on.
    """

    label: str
    factor: float
    relative_sd: float
    counted: int


@dataclass(frozen=True, slots=True)
class CyclePattern:
    """The factors of one cycle.

    Attributes
    ----------
    name : str
        The cycle.
    factors : tuple of PlaceFactor
        One a place; by the cycle's weights they average 1.
    spread : float or None
        Estimated standard deviation of the log factors, which says how far they are shrunk towards 0; None if
        they were not estimated.
    why_not : str or None
        Why there are no factors other than 1; None if they were estimated.
    """

    name: str
    factors: tuple[PlaceFactor, ...]
    spread: float | None
    why_not: str | None


@dataclass(frozen=True, slots=True)
class Pattern:
    """A stream's recurring pattern.

    Attributes
    ----------
    cycles : tuple of CyclePattern
        In the order asked for.
    known : tuple of PlaceFactor
        The kinds of known days, each a factor on top of the cycles', by label.
    known_sd : float
        Relative standard deviation of the factor of a known day that was never counted.
    dispersion, wander : float or None
        Dispersion and wander that the factors were estimated with; None if nothing was.
    """

    cycles: tuple[CyclePattern, ...]
    known: tuple[PlaceFactor, ...]
    known_sd: float
    dispersion: float | None
    wander: float | None


@dataclass(frozen=True, slots=True)
class PatternExposure:
    """What the pattern makes of one interval: the factor on its exposure, with its relative deviation."""

    factor: float
    relative_sd: float


def pattern_exposure(
    pattern: Pattern, places: Sequence[int], known_day: str | None = None
) -> PatternExposure:
    """The factor of an interval.

    Parameters
    ----------
    pattern : Pattern
        The pattern.
    places : sequence of int
        The interval's place in each of the pattern's cycles.
    known_day : str or None
        The kind of known day it is.

    Returns
    -------
    PatternExposure
        Product of the factors; their relative errors are taken as independent.

    Examples
    --------
    >>> flat = Pattern((), (PlaceFactor("bank holiday", 0.5, 0.1, 4),), 0.3, None, None)
    >>> pattern_exposure(flat, (), "bank holiday")
    PatternExposure(factor=0.5, relative_sd=0.1)
    >>> pattern_exposure(flat, (), "election").relative_sd
    0.3
    """
    factor, variance = 1.0, 0.0
    for cycle, place in zip(pattern.cycles, places, strict=True):
        factor *= cycle.factors[place].factor
        variance += cycle.factors[place].relative_sd ** 2
    if known_day is not None:
        kinds = {kind.label: kind for kind in pattern.known}
        kind = kinds.get(known_day, PlaceFactor(known_day, 1.0, pattern.known_sd, 0))
        factor *= kind.factor
        variance += kind.relative_sd**2
    return PatternExposure(factor, math.sqrt(variance))


def with_pattern(
    observations: Sequence[Observation], exposures: Sequence[PatternExposure]
) -> list[Observation]:
    """Observations whose exposures carry the pattern.

    Examples
    --------
    >>> with_pattern([Observation(0, 5)], [PatternExposure(0.5, 0.1)])[0].exposure
    0.5
    """
    return [
        Observation(
            position=observation.position,
            count=observation.count,
            exposure=observation.exposure * pattern.factor,
            relative_sd=math.hypot(observation.relative_sd, pattern.relative_sd),
        )
        for observation, pattern in zip(observations, exposures, strict=True)
    ]
