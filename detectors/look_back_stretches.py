"""Which stretches of a record hold one shift each.

Given all counts, a shift's date is a distribution over neighbouring places, often with several modes. Places
belong to one shift when they exclude one another: when a second shift between them is not expected.
"""

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from detectors.look_back_passes import NO_WEIGHT, Passes

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

LEAST_PROBABILITY = 0.5
"""A stretch is reported when it holds a shift with at least this probability."""
PRIOR_SHIFTS = 0.25
"""... and the prior expects at most this many in the part of it that holds so much."""
SECOND_SHIFT = 0.1
"""A stretch is widened as long as fewer shifts than this are expected in it beside the first."""
NEGLIGIBLE = 0.001
"""A stretch is not widened over a piece that holds less than this."""


@dataclass(frozen=True, slots=True)
class Stretch:
    """Counts among which one shift lies.

    Attributes
    ----------
    first, last : int
        First and last count that may have begun the new level, both included.
    probability : float
        Probability that at least one shift lies there.
    """

    first: int
    last: int
    probability: float


def chance_of_shift(passes: Passes, first: int, last: int) -> float:
    """Probability, given all counts, that at least one run starts from one count to another.

    Parameters
    ----------
    passes : Passes
        The record.
    first, last : int
        Both at least 1, both included.

    Returns
    -------
    float
        Exact: the forward pass is repeated over the stretch with no shift allowed.
    """
    chain, weights = passes.chain, passes.forward[first - 1]
    for index in range(first, last + 1):
        weights = chain.walked(index, weights) @ chain.phases(index).stay
        weights *= passes.probability[index][:, None]
        weights /= chain.bench.grid.spread(np.exp(passes.log_scale[index]))[:, None]
    without = chain.by_pair(np.einsum("rk,rk->r", weights, passes.backward[last]))
    whole = chain.by_pair(np.einsum("rk,rk->r", passes.forward[last], passes.backward[last]))
    none = float((without / np.maximum(whole, NO_WEIGHT)) @ passes.pair_weight)
    return min(max(1.0 - none, 0.0), 1.0)


def stretches(passes: Passes) -> tuple[Stretch, ...]:
    """The stretches that hold one shift each, in order.

    Parameters
    ----------
    passes : Passes
        The record.

    Returns
    -------
    tuple of Stretch
        They do not overlap.

    Notes
    -----
    The record is cut at the local minima of the shift probability. Beginning with the piece that has the
    highest peak, a stretch takes in the neighbouring piece with more probability first, as long as a second
    shift is not expected there. It is reported when it holds a shift with at least `LEAST_PROBABILITY`, and a
    part so short that the prior would hardly expect one holds that much.
    """
    probability = passes.shift_probability
    pieces = _pieces(probability)
    free = dict(enumerate(pieces))
    found = []
    for place in sorted(free, key=lambda i: -probability[pieces[i][0] : pieces[i][1] + 1].max()):
        if place not in free:
            continue
        taken = _widened(passes, probability, pieces, free, place)
        for one in taken:
            del free[one]
        first, last = pieces[taken[0]][0], pieces[taken[-1]][1]
        if _dense(passes, probability, first, last):
            found.append(Stretch(first, last, chance_of_shift(passes, first, last)))
        elif probability[first : last + 1].sum() < LEAST_PROBABILITY / 4.0:
            break
    return tuple(
        sorted((one for one in found if one.probability >= LEAST_PROBABILITY), key=lambda one: one.first)
    )


def _pieces(probability: FloatArray) -> list[tuple[int, int]]:
    """The record from its second count on, cut after each local minimum of the shift probability."""
    cuts = [
        index
        for index in range(2, probability.size - 1)
        if probability[index] <= probability[index - 1] and probability[index] < probability[index + 1]
    ]
    edges = [1, *(cut + 1 for cut in cuts), probability.size]
    return [(begin, end - 1) for begin, end in pairwise(edges) if begin < end]


def _widened(
    passes: Passes,
    probability: FloatArray,
    pieces: list[tuple[int, int]],
    free: dict[int, tuple[int, int]],
    place: int,
) -> list[int]:
    """The pieces of the stretch around one piece."""
    mass = {one: float(probability[first : last + 1].sum()) for one, (first, last) in free.items()}
    taken, blocked = [place], set()
    # What is expected beside the first shift grows by at most the mass that is taken in.
    beside = mass[place]
    while True:
        sides = [one for one in (taken[0] - 1, taken[-1] + 1) if one not in blocked]
        sides = [one for one in sides if mass.get(one, 0.0) >= NEGLIGIBLE]
        if not sides:
            return taken
        side = max(sides, key=lambda one: mass[one])
        wider = sorted((*taken, side))
        if beside + mass[side] > SECOND_SHIFT:
            exact = _beside(passes, probability, pieces[wider[0]][0], pieces[wider[-1]][1])
            if exact > SECOND_SHIFT:
                blocked.add(side)
                continue
            beside = exact
        else:
            beside += mass[side]
        taken = wider


def _beside(passes: Passes, probability: FloatArray, first: int, last: int) -> float:
    """Shifts expected in a stretch beside the first one."""
    expected = float(probability[first : last + 1].sum())
    if expected - 1.0 > SECOND_SHIFT:
        return expected - 1.0
    return expected - chance_of_shift(passes, first, last)


def _dense(passes: Passes, probability: FloatArray, first: int, last: int) -> bool:
    """Whether a part over which the prior expects few shifts holds as much as a report needs."""
    positions = np.array([one.position for one in passes.chain.counts])
    longest = max(math.floor(PRIOR_SHIFTS * passes.chain.model.gap.mean), 1)
    running = np.concatenate(([0.0], np.cumsum(probability)))
    start = np.arange(first, last + 1)
    end = np.minimum(np.searchsorted(positions, positions[start] + longest, side="left"), last + 1)
    return bool((running[end] - running[start]).max() >= LEAST_PROBABILITY)
