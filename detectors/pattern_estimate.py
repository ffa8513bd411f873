"""Estimates a stream's recurring pattern on its own past, together with its level, wander and dispersion."""

import itertools
import statistics
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from detectors.cycles import Cycle
from detectors.errors import NotInOrder, UnusableParameter
from detectors.model import Model
from detectors.observation import Observation
from detectors.pattern import CyclePattern, Pattern, PlaceFactor
from detectors.pattern_search import Factors, average, search
from detectors.pattern_start import begin

FloatArray = NDArray[np.float64]

FEWEST_TURNS = 3
"""Turns of a cycle in which its places must have been counted before factors are estimated."""
FEWEST_COUNTS = 50
"""Sum of all counts below which no factor is estimated: the chance of counts would be all there is to see."""
UNSEEN_SD = 0.3
"""Relative deviation of a known day of a kind never counted, while fewer than three kinds have been."""

_TELLING_KINDS = 3
_PLAIN_WINDOW = 7


@dataclass(frozen=True, eq=False)
class Seen:
    """A group of factors: which counts carry each, and what was found.

    Attributes
    ----------
    group : ndarray, shape (n, places)
    factors : Factors
    """

    group: FloatArray
    factors: Factors


def estimate_pattern(
    observations: Sequence[Observation],
    cycles: Sequence[Cycle],
    *,
    known_days: Sequence[str | None] = (),
    model: Model | None = None,
    fewest_turns: int = FEWEST_TURNS,
) -> Pattern:
    """Estimate a stream's recurring factors together with its level, wander and dispersion.

    Parameters
    ----------
    observations : sequence of Observation
        The stream's past, without a pattern in the exposures; missing counts are left out.
    cycles : sequence of Cycle
        Where each observation stands in each cycle. An hour with a weekday is two cycles.
    known_days : sequence of (str or None)
        For each observation the kind of known day it is ("bank holiday"), or None; empty: none are known.
    model : Model or None
        Whose one-off component is used; None for the standard model.
    fewest_turns : int
        Least number of turns of a cycle (median over its counted places), at least 2.

    Returns
    -------
    Pattern
        A cycle with too few turns has factors of 1 and says why.

    Raises
    ------
    UnusableObservation
        If the observations do not ascend.
    UnusableParameter
        If a cycle or the known days are not as long as the observations.

    Notes
    -----
    Log factors b_j of a cycle are a priori N(0, v); log levels walk with heavy-tailed steps (t, 3 degrees of
    freedom), so a shift is a step of the level and not part of the pattern; one-offs are the model's own
    mixture and weigh little. b and level are the most probable ones together (`pattern_fit.fit`); wander and
    dispersion are those of the largest Laplace evidence (`pattern_search.search`), and b is averaged over v
    by its evidence (`pattern_search.average`), v as good as 0 among its values. For one v, with I_j the
    information on b_j beyond the level and raw_j its estimate without shrinkage, b_j is about
    raw_j v / (v + 1 / I_j): few data, or a small v, pull it to 0. The factors are
    exp(b_j) sum_k weight_k / sum_k weight_k exp(b_k).

    References
    ----------
    Efron & Morris (1973), Stein's estimation rule and its competitors, JASA 68, 117-130: shrinkage by an
    estimated variance. Tierney & Kadane (1986), JASA 81, 82-86: Laplace's approximation.

    Examples
    --------
    >>> from detectors.cycles import every
    >>> weeks = [Observation(day, 200 if day % 7 == 5 else 100) for day in range(70)]
    >>> saturday = estimate_pattern(weeks, [every(7, range(70))]).cycles[0].factors[5]
    >>> saturday.counted, round(saturday.factor, 2)
    (10, 1.74)
    """
    _check(observations, cycles, known_days, fewest_turns)
    counted = [k for k, observation in enumerate(observations) if observation.count is not None]
    total = sum(observations[k].count or 0 for k in counted)
    if total < FEWEST_COUNTS:
        why = f"{total} were counted in all; {FEWEST_COUNTS} are needed"
        return Pattern(tuple(_flat(cycle, why) for cycle in cycles), (), UNSEEN_SD, None, None)
    why_not = [_why_not(cycle, counted, fewest_turns) for cycle in cycles]
    used = [cycle for cycle, why in zip(cycles, why_not, strict=True) if why is None]
    marks = [known_days[k] for k in counted] if known_days else []
    kinds = sorted({mark for mark in marks if mark is not None})
    groups = [_places(cycle, counted) for cycle in used] + ([_kinds(marks, kinds)] if kinds else [])
    if not groups:
        flat = tuple(_flat(cycle, why) for cycle, why in zip(cycles, why_not, strict=True))
        return Pattern(flat, (), UNSEEN_SD, None, None)
    window = max((len(cycle.labels) for cycle in used), default=_PLAIN_WINDOW)
    series, start = begin([observations[k] for k in counted], np.hstack(groups), window)
    sizes = [group.shape[1] for group in groups]
    best = search(series, sizes, model or Model(), start)
    seen = [Seen(group, factors) for group, factors in zip(groups, average(series, sizes, best), strict=True)]
    known, known_sd = _known(kinds, seen.pop()) if kinds else ((), UNSEEN_SD)
    told = [
        _flat(cycle, why) if why else _cycle(cycle, seen.pop(0))
        for cycle, why in zip(cycles, why_not, strict=True)
    ]
    return Pattern(tuple(told), known, known_sd, best[0].dispersion, best[0].wander)


def _check(
    observations: Sequence[Observation],
    cycles: Sequence[Cycle],
    known_days: Sequence[str | None],
    fewest_turns: int,
) -> None:
    positions = [observation.position for observation in observations]
    for before, after in itertools.pairwise(positions):
        if after <= before:
            raise NotInOrder(before, after)
    for cycle in cycles:
        if len(cycle.place) != len(positions):
            raise UnusableParameter(f"cycle {cycle.name}", len(cycle.place), f"{len(positions)} places long")
    if len(known_days) not in (0, len(positions)):
        raise UnusableParameter("known_days", len(known_days), f"{len(positions)} entries long, or empty")
    if fewest_turns < 2:
        raise UnusableParameter("fewest_turns", fewest_turns, "at least 2")


def _why_not(cycle: Cycle, counted: Sequence[int], fewest_turns: int) -> str | None:
    turns: dict[int, set[int]] = {}
    for k in counted:
        turns.setdefault(cycle.place[k], set()).add(cycle.turn[k])
    if len(turns) < 2:
        return f"counts lie at {len(turns)} of {len(cycle.labels)} places of the cycle"
    seen = statistics.median_low(len(of_place) for of_place in turns.values())
    if seen < fewest_turns:
        return f"its places were counted in {seen} turns; {fewest_turns} are needed"
    return None


def _places(cycle: Cycle, counted: Sequence[int]) -> FloatArray:
    """One column a place, 1 where a count lies there."""
    return np.eye(len(cycle.labels))[[cycle.place[k] for k in counted]]


def _kinds(marks: Sequence[str | None], kinds: Sequence[str]) -> FloatArray:
    """One column a kind of known day."""
    return np.array([[float(mark == kind) for kind in kinds] for mark in marks])


def _flat(cycle: Cycle, why_not: str | None) -> CyclePattern:
    factors = tuple(PlaceFactor(label, 1.0, 0.0, 0) for label in cycle.labels)
    return CyclePattern(cycle.name, factors, None, why_not)


def _known(kinds: Sequence[str], seen: Seen) -> tuple[tuple[PlaceFactor, ...], float]:
    """The factors of known days, and the deviation of a kind that was never counted."""
    known = _factors(kinds, seen.group, seen.factors.log_factor, seen.factors.covariance)
    spread = seen.factors.spread
    return known, spread if len(kinds) >= _TELLING_KINDS else max(spread, UNSEEN_SD)


def _cycle(cycle: Cycle, seen: Seen) -> CyclePattern:
    """The cycle's factors, made to average 1, with the errors that they have then (delta method)."""
    log_factor = seen.factors.log_factor
    share = np.array(cycle.weights) * np.exp(log_factor)
    average_factor = share.sum() / sum(cycle.weights)
    less_average = np.eye(log_factor.size) - share / share.sum()
    covariance = less_average @ seen.factors.covariance @ less_average.T
    factors = _factors(cycle.labels, seen.group, log_factor - np.log(average_factor), covariance)
    return CyclePattern(cycle.name, factors, seen.factors.spread, None)


def _factors(
    labels: Sequence[str], group: FloatArray, log_factor: FloatArray, covariance: FloatArray
) -> tuple[PlaceFactor, ...]:
    columns = zip(
        labels,
        np.exp(log_factor).tolist(),
        np.sqrt(np.diag(covariance)).tolist(),
        group.sum(axis=0).astype(int).tolist(),
        strict=True,
    )
    return tuple(PlaceFactor(*column) for column in columns)
