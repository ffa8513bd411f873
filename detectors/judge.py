"""When a shift is announced: the one rule that rings, for the daemon, for replays and for planning alike."""

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from detectors.errors import UnusableParameter
from detectors.filter_state import FilterState, Step
from detectors.gap_prior import GapPrior
from detectors.posterior import Announcement, Quantiles
from detectors.quantiles import level_quantiles

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

REGION_SHARE = 0.9


@dataclass(frozen=True, slots=True)
class Rule:
    """When the recent shift probability rings.

    Attributes
    ----------
    threshold : float
        Recent shift probability at which a shift is announced, above 0 and below 1.
    window : int
        Longest run length that is recent, in counts.
    lasting : int
        Shortest run length that may ring, in counts: a single odd count does not.
    fewest_counts : int
        With fewer counts than this the stream is too short to say, and nothing rings.
    """

    threshold: float = 0.9
    window: int = 40
    lasting: int = 3
    fewest_counts: int = 12

    def __post_init__(self) -> None:
        if not 0.0 < self.threshold < 1.0:
            raise UnusableParameter("threshold", self.threshold, "above 0 and below 1")
        if not 1 <= self.lasting <= self.window:
            raise UnusableParameter("lasting", self.lasting, f"from 1 to the window, {self.window}")
        if self.fewest_counts < 1:
            raise UnusableParameter("fewest_counts", self.fewest_counts, "at least 1")


@dataclass(frozen=True, slots=True)
class Memory:
    """What the judge remembers from count to count.

    Attributes
    ----------
    last_announced : int
        Number of the count at which the last shift was announced; 0 if none was.
    positions : tuple of int
        Positions of the last counts, as many as the window and one more, the newest last.
    levels : tuple of Quantiles
        Filtered level at each of them.
    """

    last_announced: int = 0
    positions: tuple[int, ...] = ()
    levels: tuple[Quantiles, ...] = field(default=())


@dataclass(frozen=True, slots=True)
class Verdict:
    """The judge's word on one count."""

    recent_shift: float
    announcement: Announcement | None
    memory: Memory


def prior_floor(gap: GapPrior, rule: Rule) -> float:
    """Recent shift probability of a long-watched stream whose counts say nothing.

    Parameters
    ----------
    gap : GapPrior
        Prior of the length of a run.
    rule : Rule
        The rule.

    Returns
    -------
    float
        A threshold at or below it would ring for ever.

    Examples
    --------
    >>> round(prior_floor(GapPrior(shape=1, mean=100.0), Rule(window=40, lasting=1)), 3)
    0.331
    """
    survival = np.exp(gap.log_survival(np.arange(rule.lasting - 1, rule.window)))
    return float(survival.sum() / gap.mean)


def judge(state: FilterState, step: Step, memory: Memory, rule: Rule) -> Verdict:
    """Judge the posterior after a count.

    Parameters
    ----------
    state : FilterState
        The state after the count.
    step : Step
        What the count did.
    memory : Memory
        The judge's memory before the count.
    rule : Rule
        The rule.

    Returns
    -------
    Verdict
        Recent shift probability, the announcement if it rings, and the memory after the count.

    Notes
    -----
    q = P(lasting <= run length <= window, the run is not the first and starts after the last announcement).
    """
    keep = rule.window + 1
    memory = Memory(
        memory.last_announced,
        (*memory.positions, state.position)[-keep:],
        (*memory.levels, step.level)[-keep:],
    )
    recent = recent_slots(step, state.counted, memory.last_announced, rule)
    probability = float(min(step.run_mass[0, recent].sum(), 1.0))
    if probability < rule.threshold or state.counted < rule.fewest_counts:
        return Verdict(probability, None, memory)
    told = _announcement(state, step, memory, recent, probability)
    return Verdict(probability, told, Memory(state.counted, memory.positions, memory.levels))


def recent_slots(step: Step, counted: int, last_announced: int, rule: Rule) -> IntArray:
    """The slots whose run is recent, has lasted, is not the first and began after the last announcement."""
    start = step.slots.newest
    length = counted - start + 1
    recent = step.slots.used & (length >= rule.lasting) & (length <= rule.window) & (start > last_announced)
    recent[0] = False
    return np.flatnonzero(recent)


def region(positions: IntArray, mass: FloatArray, share: float) -> tuple[int, ...]:
    """Smallest set of positions that holds a share of the mass; of equal ones the later comes first.

    Parameters
    ----------
    positions : ndarray of int, shape (n,)
        The positions.
    mass : ndarray, shape (n,)
        Their weights, not all 0.
    share : float
        Share to be held.

    Returns
    -------
    tuple of int
        The positions, ascending.

    Examples
    --------
    >>> region(np.array([3, 4, 5]), np.array([0.1, 0.5, 0.4]), 0.9)
    (4, 5)
    """
    order = np.lexsort((-positions, -mass))
    running = np.cumsum(mass[order])
    needed = int(np.searchsorted(running, share * running[-1] * (1.0 - 1e-12))) + 1
    return tuple(sorted(positions[order[:needed]].tolist()))


def _announcement(
    state: FilterState, step: Step, memory: Memory, recent: IntArray, probability: float
) -> Announcement:
    mass = step.run_mass[0, recent]
    ago = state.counted - step.slots.newest[recent]
    positions = np.array(memory.positions)[len(memory.positions) - 1 - ago]
    best = int(np.lexsort((-positions, -mass))[0])
    before = memory.levels[len(memory.levels) - 2 - int(ago[best])]
    share = np.exp(state.log_weight) / state.pair_total
    columns = state.weights[:, recent] @ state.run_factor[recent].astype(state.weights.dtype)
    after = level_quantiles(state.grid, columns * state.grid.spread(share))
    return Announcement(
        position=state.position,
        start_position=int(positions[best]),
        region=region(positions, mass, REGION_SHARE),
        probability=probability,
        level_before=before,
        level_after=after,
    )
