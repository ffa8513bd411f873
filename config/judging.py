"""What the detector assumes of a stream, and when a shift is announced."""

from config.base import Block
from config.values import (
    Dispersions,
    FewestCounts,
    GapShape,
    Lasting,
    MeanGap,
    OneOffShare,
    SmallestShift,
    Threshold,
    Wanders,
    Window,
)


class Judgement(Block):
    """When a shift is announced. Threshold is a probability, the others are numbers of counts."""

    threshold: Threshold = 0.9
    window: Window = 40
    lasting: Lasting = 3
    fewest_counts: FewestCounts = 12


class Model(Block):
    """What is assumed of a stream; where `dispersions` or `wanders` is None the program's own are meant."""

    mean_gap: MeanGap = 150.0
    gap_shape: GapShape = 2
    smallest_shift: SmallestShift = 0.15
    one_off_share: OneOffShare = 0.02
    dispersions: Dispersions | None = None
    wanders: Wanders | None = None


class JudgementChanges(Block):
    """The part of Judgement that is otherwise for some streams."""

    threshold: Threshold | None = None
    window: Window | None = None
    lasting: Lasting | None = None
    fewest_counts: FewestCounts | None = None


class ModelChanges(Block):
    """The part of Model that is otherwise for some streams."""

    mean_gap: MeanGap | None = None
    gap_shape: GapShape | None = None
    smallest_shift: SmallestShift | None = None
    one_off_share: OneOffShare | None = None
    dispersions: Dispersions | None = None
    wanders: Wanders | None = None


def changed_judgement(plain: Judgement, changes: JudgementChanges) -> Judgement:
    """The judgement with what was changed put in."""
    return plain.model_copy(update=changes.model_dump(exclude_none=True))


def changed_model(plain: Model, changes: ModelChanges) -> Model:
    """The model with what was changed put in."""
    return plain.model_copy(update=changes.model_dump(exclude_none=True))
