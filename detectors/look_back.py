"""Looking back on a whole record: what all its counts together say of each shift.

Nothing here is what the filter said when a count came in: every figure rests on the counts before and after.
"""

from collections.abc import Sequence
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from detectors.errors import NotInOrder, UnusableParameter
from detectors.judge import region
from detectors.look_back_chain import chain_for
from detectors.look_back_levels import Effect, effect_at
from detectors.look_back_number import number_of_shifts
from detectors.look_back_passes import Passes, both_passes
from detectors.look_back_results import DateRegion, LookBack, Shift
from detectors.look_back_segments import Segmentation, most_probable_segmentation
from detectors.look_back_stretches import Stretch, stretches
from detectors.model import Model
from detectors.observation import Observation
from detectors.posterior import Quantiles, Weighted
from detectors.quantiles import level_quantiles

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

REGION_SHARE = 0.9
LEAST_MODE = 0.1


def look_back(model: Model, observations: Sequence[Observation]) -> LookBack:
    """Look back on a record with all its counts.

    Parameters
    ----------
    model : Model
        The model, the same as the filter's.
    observations : sequence of Observation
        The record, in ascending order of position; missing counts make the gap to the next one longer.

    Returns
    -------
    LookBack

    Raises
    ------
    NotInOrder
        If an observation does not lie after the one before it.

    Notes
    -----
    Forward-backward recursions on fixed level grids, one for each pair of dispersion and wander. A
    negative-binomial run length is a chain of phases, so the state is level and phase: O(n x shape x levels),
    no run start is merged or cut off, and given the grids the result equals the sum over all segmentations
    (tests: to 1e-9). What is approximate: the grids (probabilities change by some 1e-4 when they are twice as
    fine), and the pairs left out, which are below 1e-6 given the whole record, or fell behind by a factor of
    1e-35 on the way.

    References
    ----------
    Fearnhead (2006), Exact and efficient Bayesian inference for multiple changepoint problems, Statistics
    and Computing 16, 203-213. Fearnhead & Liu (2007), JRSS B 69, 589-605.

    Examples
    --------
    >>> counts = [52, 47, 55, 49, 50, 53, 48, 51, 50, 46, 21, 19, 24, 20, 18, 22, 21, 19, 20, 23]
    >>> back = look_back(Model(), [Observation(week, count) for week, count in enumerate(counts)])
    >>> [(shift.index, shift.region.indices) for shift in back.shifts]
    [(10, (10,))]
    >>> effect = back.shifts[0].effect
    >>> effect.low < 0.42 < effect.high
    True
    """
    where = _counted(observations)
    if not where:
        return _nothing(len(observations))
    passes = both_passes(chain_for(model, [observations[index] for index in where]))
    return _said(passes, np.array(where), len(observations))


def effect_of(model: Model, observations: Sequence[Observation], dates: Sequence[int]) -> Effect:
    """The levels on both sides of a shift that is known to lie among some observations.

    Parameters
    ----------
    model : Model
        The model, the same as the filter's.
    observations : sequence of Observation
        The record up to now, in ascending order of position.
    dates : sequence of int
        Indices of the observations that may have begun the new level, such as an announcement's region;
        missing counts among them are passed over.

    Returns
    -------
    Effect
        Levels and effect from their joint posterior, given all observations; each date weighs as much as its
        shift probability.

    Raises
    ------
    NotInOrder
        If an observation does not lie after the one before it.
    UnusableParameter
        If no shift is possible at any of the dates.

    Examples
    --------
    >>> counts = [52, 47, 55, 49, 50, 53, 48, 51, 50, 46, 21, 19, 24, 20]
    >>> said = effect_of(Model(), [Observation(week, count) for week, count in enumerate(counts)], [9, 10])
    >>> said.effect.low < 0.42 < said.effect.high
    True
    """
    where = _counted(observations)
    places = [place for place, index in enumerate(where) if place > 0 and index in dates]
    needed = "the indices of counts at which a shift is possible"
    if not places:
        raise UnusableParameter("dates", tuple(dates), needed)
    passes = both_passes(chain_for(model, [observations[index] for index in where]))
    if not passes.shift_probability[places].sum() > 0.0:
        raise UnusableParameter("dates", tuple(dates), needed)
    return effect_at(passes, places)


def _counted(observations: Sequence[Observation]) -> list[int]:
    """Indices of the observations that have a count."""
    for before, after in pairwise(observations):
        if after.position <= before.position:
            raise NotInOrder(before.position, after.position)
    return [index for index, one in enumerate(observations) if one.count is not None]


def _nothing(size: int) -> LookBack:
    """A record without a single count says nothing; with certainty it shows no shift."""
    unknown = (None,) * size
    nothing = Weighted((), ())
    return LookBack(unknown, unknown, unknown, (1.0,), (), Segmentation((), 1.0), nothing, nothing, 0.0)


def _said(passes: Passes, where: IntArray, size: int) -> LookBack:
    grid, bench = passes.chain.bench.grid, passes.chain.bench
    levels: list[Quantiles | None] = [None] * size
    for index, mass in zip(where.tolist(), passes.level_mass, strict=True):
        levels[index] = level_quantiles(grid, mass)
    best = most_probable_segmentation(passes)
    return LookBack(
        shift_probability=_placed(passes.shift_probability, where, size),
        level=tuple(levels),
        one_off=_placed(passes.one_off, where, size),
        number=tuple(number_of_shifts(passes).tolist()),
        shifts=tuple(shift_in(passes, stretch, where) for stretch in stretches(passes)),
        segmentation=Segmentation(tuple(where[list(best.starts)].tolist()), best.probability),
        dispersion=_weighted(bench.dispersions, passes.pair_weight),
        wander=_weighted(bench.wanders, passes.pair_weight),
        log_evidence=passes.log_evidence,
    )


def _placed(values: FloatArray, where: IntArray, size: int) -> tuple[float | None, ...]:
    placed: list[float | None] = [None] * size
    for index, value in zip(where.tolist(), values.tolist(), strict=True):
        placed[index] = value
    return tuple(placed)


def _weighted(grouped: tuple[FloatArray, IntArray], weight: FloatArray) -> Weighted:
    values, group = grouped
    return Weighted(tuple(values.tolist()), tuple(np.bincount(group, weights=weight).tolist()))


def shift_in(passes: Passes, stretch: Stretch, where: IntArray) -> Shift:
    """The shift that lies in a stretch.

    Parameters
    ----------
    passes : Passes
        The record without its missing counts.
    stretch : Stretch
        The counts among which it lies.
    where : ndarray of int, shape (n,)
        Index of each count among all observations.

    Returns
    -------
    Shift
    """
    dates = np.arange(stretch.first, stretch.last + 1)
    probability = passes.shift_probability
    mass = probability[dates]
    # A second shift beside the first adds to the mass; the region is to hold its share of one.
    share = REGION_SHARE * min(stretch.probability / float(mass.sum()), 1.0)
    chosen = np.array(region(dates, mass, share))
    best = int(dates[np.lexsort((-dates, -mass))[0]])
    effect = effect_at(passes, chosen.tolist())
    return Shift(
        index=int(where[best]),
        probability=stretch.probability,
        region=DateRegion(
            indices=tuple(where[chosen].tolist()),
            probability=min(float(probability[chosen].sum()), stretch.probability),
            modes=tuple(where[_modes(probability, chosen)].tolist()),
        ),
        level_before=effect.level_before,
        level_after=effect.level_after,
        effect=effect.effect,
    )


def _modes(probability: FloatArray, chosen: IntArray) -> IntArray:
    padded = np.concatenate((probability, [0.0]))
    higher = (padded[chosen] > padded[chosen - 1]) & (padded[chosen] >= padded[chosen + 1])
    peaks = chosen[higher & (padded[chosen] >= LEAST_MODE * padded[chosen].max())]
    ordered: IntArray = peaks[np.argsort(-padded[peaks], kind="stable")]
    return ordered
