"""From a checkpoint and observations to posteriors and announcements. Pure: no clock, database or socket."""

from collections.abc import Sequence
from dataclasses import dataclass

from detectors.advance import Checkpoint, advance, start
from detectors.checkpoint_bytes import from_bytes, to_bytes
from detectors.judge import Rule
from detectors.model import Model
from detectors.observation import Observation
from detectors.posterior import Announcement, Posterior

STEPS_BACK = (256, 64, 16, 4)
"""So many observations before the end of a long fold a checkpoint is left, for corrections."""


@dataclass(frozen=True, slots=True)
class Saved:
    """A checkpoint after so many observations."""

    folded: int
    body: bytes


@dataclass(frozen=True, slots=True)
class Folded:
    """What a fold from place `begun` on led to; one posterior (or None) per place from there."""

    begun: int
    posteriors: tuple[Posterior | None, ...]
    announcements: tuple[Announcement, ...]
    saved: tuple[Saved, ...]


def resume(folded: int, body: bytes | None, model: Model) -> tuple[int, Checkpoint]:
    """Take up a stored checkpoint, or start at the first observation.

    Raises
    ------
    detectors.errors.UnreadableCheckpoint
        If the bytes do not belong to this model or are damaged.
    """
    if body is None:
        return 0, start(model)
    return folded, from_bytes(body, model)


def fold(begun: int, checkpoint: Checkpoint, observations: Sequence[Observation], rule: Rule) -> Folded:
    """Fold the observations from place `begun` on, leaving a few checkpoints before the end and one there.

    The one at the end is left even where there was nothing to fold: what lay beyond it is gone then.
    """
    posteriors: list[Posterior | None] = []
    announcements: list[Announcement] = []
    saved: list[Saved] = []
    place = begun
    for end in _stops(begun, len(observations)):
        done = advance(checkpoint, observations[place:end], rule)
        posteriors.extend(done.posteriors)
        announcements.extend(done.announcements)
        checkpoint, place = done.checkpoint, end
        saved.append(Saved(end, to_bytes(checkpoint)))
    return Folded(begun, tuple(posteriors), tuple(announcements), tuple(saved))


def _stops(begun: int, end: int) -> list[int]:
    return [*(end - back for back in STEPS_BACK if end - back > begun), end]
