"""What looking back on a record gives."""

from dataclasses import dataclass

from detectors.look_back_segments import Segmentation
from detectors.posterior import Quantiles, Weighted


@dataclass(frozen=True, slots=True)
class DateRegion:
    """Where one shift lies.

    Attributes
    ----------
    indices : tuple of int
        Smallest set of observations that holds 90 % of the shift's probability, ascending. It may have gaps.
        Of equally probable ones the later is taken first.
    probability : float
        Probability that a shift lies in the region.
    modes : tuple of int
        Observations in it that are more probable than both neighbouring counts and at least a tenth as
        probable as the most probable one, most probable first.
    """

    indices: tuple[int, ...]
    probability: float
    modes: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Shift:
    """One shift, seen with all counts.

    Attributes
    ----------
    index : int
        Observation that most probably is the first at the new level.
    probability : float
        Probability that there is a shift around there (see `detectors.look_back_stretches`).
    region : DateRegion
        Where it lies.
    level_before, level_after : Quantiles
        Level just before and just after it, given that it lies in the region.
    effect : Quantiles
        Level after / level before, from the joint posterior of both.
    """

    index: int
    probability: float
    region: DateRegion
    level_before: Quantiles
    level_after: Quantiles
    effect: Quantiles


@dataclass(frozen=True, slots=True)
class LookBack:
    """What all counts of a record together say. Indices count its observations from 0, missing ones included.

    Attributes
    ----------
    shift_probability : tuple of (float or None)
        Probability that each observation is the first of a new run; None for a missing count. A shift that
        came within missing counts is found at the next count. The first count begins no new run: 0.
    level : tuple of (Quantiles or None)
        The level at each count.
    one_off : tuple of (float or None)
        Probability that each count is a one-off.
    number : tuple of float
        Probability of 0, 1, 2, ... shifts in the whole record.
    shifts : tuple of Shift
        The distinct shifts, earliest first.
    segmentation : Segmentation
        The most probable set of all shifts, with its probability.
    dispersion, wander : Weighted
        Their posteriors over the values considered and not dropped.
    log_evidence : float
        Log probability of the counts.
    """

    shift_probability: tuple[float | None, ...]
    level: tuple[Quantiles | None, ...]
    one_off: tuple[float | None, ...]
    number: tuple[float, ...]
    shifts: tuple[Shift, ...]
    segmentation: Segmentation
    dispersion: Weighted
    wander: Weighted
    log_evidence: float
