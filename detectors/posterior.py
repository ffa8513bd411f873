"""What the filter and the judge say after an observation."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Quantiles:
    """The 5 %, 50 % and 95 % quantiles of a level (counts per unit of exposure)."""

    low: float
    mid: float
    high: float


@dataclass(frozen=True, slots=True)
class RunLengths:
    """The run-length posterior, as groups of neighbouring run lengths, shortest first.

    Attributes
    ----------
    shortest, longest : tuple of int
        The run lengths (in counts, the newest count included) that each group spans, both ends included.
    probability : tuple of float
        The probability of each group; they sum to 1.
    holds_first_run : bool
        Whether the last group is the first run, the one that was under way before anyone watched.
    """

    shortest: tuple[int, ...]
    longest: tuple[int, ...]
    probability: tuple[float, ...]
    holds_first_run: bool


@dataclass(frozen=True, slots=True)
class Weighted:
    """A discrete posterior: values with their probabilities."""

    value: tuple[float, ...]
    probability: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class Posterior:
    """Everything said after one observation. A missing count has no posterior.

    Attributes
    ----------
    position : int
        The observation's place on the stream's axis.
    counted : int
        Number of counts folded so far, this one included.
    run_lengths : RunLengths
        The run-length posterior.
    run_length_mode : int
        The most probable run length (of a group: its shortest).
    recent_shift : float
        Probability that a shift lies within the window (see `detectors.judge`).
    level : Quantiles
        The filtered level.
    dispersion, wander : Weighted
        Their posteriors over the grid.
    one_off : float
        Probability that this count was a one-off.
    log_predictive : float
        Log probability of this count given those before it.
    pit : tuple of float
        Predictive distribution function just below and at the count: F(x - 1), F(x).
    """

    position: int
    counted: int
    run_lengths: RunLengths
    run_length_mode: int
    recent_shift: float
    level: Quantiles
    dispersion: Weighted
    wander: Weighted
    one_off: float
    log_predictive: float
    pit: tuple[float, float]


@dataclass(frozen=True, slots=True)
class Announcement:
    """The judge rings: a shift is announced at an observation. All figures are filtered ones.

    Attributes
    ----------
    position : int
        Position of the announcing observation.
    start_position : int
        Most probable position of the first count at the new level.
    region : tuple of int
        Smallest set of start positions that holds 90 % of the recent shift probability, ascending.
    probability : float
        The recent shift probability at the announcing observation.
    level_before, level_after : Quantiles
        Filtered level just before `start_position`, and at the announcing observation given a recent shift.
    """

    position: int
    start_position: int
    region: tuple[int, ...]
    probability: float
    level_before: Quantiles
    level_after: Quantiles
