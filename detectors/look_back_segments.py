"""The most probable segmentation of a record: all run starts taken together."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from detectors.binomial_sums import first_successes_needed, successes_needed
from detectors.look_back_chain import Chain
from detectors.look_back_passes import Passes

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

MOST_KEPT = 64
LEAST_SHARE = 1e-7
"""A beginning this much less probable than the best one, given all counts, is given up."""


@dataclass(frozen=True, slots=True)
class Segmentation:
    """All run starts of a record.

    Attributes
    ----------
    starts : tuple of int
        The counts that begin a new level, ascending; the first count is not among them.
    probability : float
        Posterior probability of exactly these shifts and no other.
    """

    starts: tuple[int, ...]
    probability: float


@dataclass(frozen=True)
class _Kept:
    """The best beginnings, one for each start of the run that is under way.

    Attributes
    ----------
    starts : tuple of tuple of int
        All starts of each, the first count's among them.
    weights : ndarray, shape (rows, beginnings)
        Joint probability of the level and the counts so far, all pairs in one unit.
    log_unit : float
        Log of that unit.
    """

    starts: tuple[tuple[int, ...], ...]
    weights: FloatArray
    log_unit: float

    def only(self, which: IntArray) -> "_Kept":
        """Some of them."""
        return replace(
            self, starts=tuple(self.starts[one] for one in which.tolist()), weights=self.weights[:, which]
        )


def most_probable_segmentation(passes: Passes) -> Segmentation:
    """Search for the most probable set of run starts, the levels summed out.

    Parameters
    ----------
    passes : Passes
        The record.

    Returns
    -------
    Segmentation
        Its probability is exact. That no other is more probable is certain where the level of a run does not
        depend on the one before (`IndependentLevels`), as long as no more than `MOST_KEPT` run starts are in
        question at a time. With a jump prior the search decides at each start which beginning of the record
        it keeps, by its probability given all counts, and may miss a segmentation that is better by a little.

    References
    ----------
    Fearnhead & Liu (2007), On-line inference for multiple changepoint problems, JRSS B 69, 589-605: the
    Viterbi recursion over run starts, section 3.
    """
    kept = _begun(passes)
    for index in range(1, len(passes.chain.counts)):
        kept = _promising(passes, index, _next(passes, index, kept))
    chances = _chances(passes, len(passes.chain.counts) - 1, kept)
    best = int(np.argmax(chances))
    return Segmentation(kept.starts[best][1:], min(float(chances[best]), 1.0))


def probability_of(passes: Passes, starts: tuple[int, ...]) -> float:
    """Posterior probability that the runs after the first start at these counts and nowhere else.

    Parameters
    ----------
    passes : Passes
        The record.
    starts : tuple of int
        Counts that begin a new level, ascending, each at least 1.

    Returns
    -------
    float
    """
    kept = _begun(passes)
    for index in range(1, len(passes.chain.counts)):
        # A new run stands last among the beginnings.
        kept = _next(passes, index, kept)
        kept = kept.only(np.array([len(kept.starts) - 1 if index in starts else 0]))
    return float(_chances(passes, len(passes.chain.counts) - 1, kept)[0])


def _begun(passes: Passes) -> _Kept:
    chain = passes.chain
    share = chain.bench.grid.spread(np.exp(passes.log_scale[0]) * _prior(passes))
    weights = passes.forward[0].sum(axis=1) * share
    return _Kept(((0,),), weights[:, None], 0.0)


def _prior(passes: Passes) -> FloatArray:
    return np.asarray(np.exp(passes.chain.log_prior), dtype=np.float64)


def _next(passes: Passes, index: int, kept: _Kept) -> _Kept:
    """One count further: every beginning goes on, and one of them is continued by a new run, placed last."""
    chain = passes.chain
    moved = chain.walked(index, kept.weights)
    hazard = _hazard(chain, index, kept)
    ahead = passes.ahead(index) * chain.bench.grid.spread(_units(passes, index))
    landing = moved.T @ chain.jump_back(ahead[:, None])[:, 0]
    best = int(np.argmax(hazard * landing))
    new = chain.jump(moved[:, best : best + 1] * hazard[best])
    weights = np.concatenate((moved * (1.0 - hazard), new), axis=1)
    weights *= passes.probability[index][:, None]
    unit = max(float(weights.sum()), 1e-290)
    starts = (*kept.starts, (*kept.starts[best], index))
    return _Kept(starts, weights / unit, kept.log_unit + float(np.log(unit)))


def _promising(passes: Passes, index: int, kept: _Kept) -> _Kept:
    chances = _chances(passes, index, kept)
    order = np.argsort(-chances, kind="stable")[:MOST_KEPT]
    order = order[chances[order] >= LEAST_SHARE * chances.max()]
    return kept.only(np.sort(order))


def _hazard(chain: Chain, index: int, kept: _Kept) -> FloatArray:
    ages, gap = _ages(chain, index - 1, kept), chain.gap(index)
    hazard = chain.model.gap.shift_within(ages, gap)
    if chain.model.first_run == "equilibrium":
        first = chain.model.gap.first_shift_within(ages, gap)
        return np.where(_still_first(kept), first, hazard)
    return hazard


def _ages(chain: Chain, index: int, kept: _Kept) -> IntArray:
    now = chain.counts[index].position
    return np.array([now - chain.counts[starts[-1]].position for starts in kept.starts])


def _still_first(kept: _Kept) -> NDArray[np.bool_]:
    return np.array([len(starts) == 1 for starts in kept.starts])


def _units(passes: Passes, index: int) -> FloatArray:
    """Unit of each pair's backward weights, the largest being 1."""
    log_unit = passes.log_backward[index]
    return np.asarray(np.exp(log_unit - log_unit.max()), dtype=np.float64)


def _chances(passes: Passes, index: int, kept: _Kept) -> FloatArray:
    """Probability of each beginning given all counts."""
    chain, gap = passes.chain, passes.chain.model.gap
    ages = _ages(chain, index, kept)
    needed = successes_needed(gap.shape, gap.p, ages)
    if chain.model.first_run == "equilibrium":
        first = first_successes_needed(gap.shape, gap.p, ages)
        needed = np.where(_still_first(kept)[:, None], first, needed)
    units = chain.bench.grid.spread(_units(passes, index))
    joint = (kept.weights.T @ (passes.backward[index] * units[:, None]) * needed).sum(axis=1)
    whole = chain.by_pair(np.einsum("rk,rk->r", passes.forward[index], passes.backward[index]))
    log_so_far = passes.log_scale[: index + 1].sum(axis=0) + chain.log_prior
    top = float(log_so_far.max())
    total = float(np.exp(log_so_far - top) @ (whole * _units(passes, index)))
    # Beginnings that cannot be have no weight at all, and next to no unit.
    return np.asarray(joint / total * np.exp(min(kept.log_unit - top, 700.0)), dtype=np.float64)
