"""The one function by which every part of the program moves a stream forward."""

from collections.abc import Iterable
from dataclasses import dataclass, field

from detectors.errors import UnusableParameter
from detectors.filter_state import FilterState
from detectors.judge import Memory, Rule, judge
from detectors.model import Model
from detectors.observation import Observation
from detectors.posterior import Announcement, Posterior
from detectors.run_length import first_count, next_count
from detectors.summary import posterior


@dataclass(frozen=True)
class Checkpoint:
    """A stream's whole state between two observations. It is never changed, so it needs no copying.

    Attributes
    ----------
    model : Model
        The model.
    state : FilterState or None
        The filter's state; None before the first count.
    memory : Memory
        The judge's memory.
    """

    model: Model
    state: FilterState | None = None
    memory: Memory = field(default_factory=Memory)


@dataclass(frozen=True)
class Advanced:
    """What some observations led to.

    Attributes
    ----------
    posteriors : tuple of (Posterior or None)
        One per observation; None for a missing count.
    checkpoint : Checkpoint
        The state after the last observation.
    announcements : tuple of Announcement
        The shifts announced, in order.
    """

    posteriors: tuple[Posterior | None, ...]
    checkpoint: Checkpoint
    announcements: tuple[Announcement, ...]


def start(model: Model) -> Checkpoint:
    """A stream of which nothing has been seen.

    Examples
    --------
    >>> start(Model()).state is None
    True
    """
    return Checkpoint(model)


def advance(checkpoint: Checkpoint, observations: Iterable[Observation], rule: Rule) -> Advanced:
    """Fold observations into a checkpoint and judge after each.

    Parameters
    ----------
    checkpoint : Checkpoint
        The state before them.
    observations : iterable of Observation
        In ascending order of position, all after the checkpoint's last. A missing count makes no step: the
        gap to the next count is longer.
    rule : Rule
        When a shift is announced.

    Returns
    -------
    Advanced

    Raises
    ------
    NotInOrder
        If an observation does not lie after the one before it.
    UnusableParameter
        If the rule's window is longer than the run lengths that the model keeps one by one.

    Examples
    --------
    >>> weeks = [Observation(week, count) for week, count in enumerate([12, 9, 14, 11, 10])]
    >>> advanced = advance(start(Model()), weeks, Rule())
    >>> len(advanced.posteriors), advanced.announcements
    (5, ())
    """
    if rule.window > checkpoint.model.accuracy.exact_run_length:
        exact = checkpoint.model.accuracy.exact_run_length
        raise UnusableParameter("window", rule.window, f"at most exact_run_length, {exact}")
    posteriors: list[Posterior | None] = []
    announcements: list[Announcement] = []
    for observation in observations:
        if observation.count is None:
            posteriors.append(None)
            continue
        said, checkpoint, announcement = _one(checkpoint, observation, rule)
        posteriors.append(said)
        if announcement is not None:
            announcements.append(announcement)
    return Advanced(tuple(posteriors), checkpoint, tuple(announcements))


def _one(
    checkpoint: Checkpoint, observation: Observation, rule: Rule
) -> tuple[Posterior, Checkpoint, Announcement | None]:
    if checkpoint.state is None:
        state, step = first_count(checkpoint.model, (observation,))
    else:
        state, step = next_count(checkpoint.state, (observation,))
    verdict = judge(state, step, checkpoint.memory, rule)
    said = posterior(state, step, observation, verdict.recent_shift)
    return said, Checkpoint(checkpoint.model, state, verdict.memory), verdict.announcement
