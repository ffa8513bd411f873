"""A record folded one count at a time, through the same `advance` as the daemon."""

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

from detectors.advance import advance, start
from detectors.errors import UnusableParameter
from detectors.judge import Rule, prior_floor
from detectors.model import Model
from detectors.posterior import Announcement, Posterior
from service.replay.places import Placed


@dataclass(frozen=True, slots=True)
class Replayed:
    """What was said of each row, earliest first, and what was announced."""

    placed: tuple[Placed, ...]
    posteriors: tuple[Posterior | None, ...]
    announcements: tuple[Announcement, ...]


def replay(
    placed: Sequence[Placed], model: Model, rule: Rule, *, step: Callable[[int], None] = lambda _steps: None
) -> Replayed:
    """Fold the rows in memory; `step` is told of each.

    Raises
    ------
    UnusableParameter
        If the threshold lies at or below what counts that say nothing reach.
    """
    require_threshold(model, rule)
    checkpoint = start(model)
    said: list[Posterior | None] = []
    announced: list[Announcement] = []
    for one in placed:
        advanced = advance(checkpoint, (one.observation,), rule)
        checkpoint = advanced.checkpoint
        said.extend(advanced.posteriors)
        announced.extend(advanced.announcements)
        step(1)
    return Replayed(tuple(placed), tuple(said), tuple(announced))


def require_threshold(model: Model, rule: Rule) -> None:
    """A threshold at or below the prior floor would ring for ever.

    Raises
    ------
    UnusableParameter
        If it lies there.
    """
    floor = prior_floor(model.gap, rule)
    if rule.threshold <= floor:
        raise UnusableParameter(
            "threshold",
            rule.threshold,
            f"above {floor:.3f}, which counts that say nothing reach with this window",
        )


def indices(placed: Iterable[Placed]) -> dict[int, int]:
    """From positions on the axis to the rows of the file."""
    return {one.observation.position: one.index for one in placed}
