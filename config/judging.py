"""When a shift is announced, and what is assumed of a stream: defaults, and changes of single values."""

import math
from typing import Annotated, Any

from pydantic import AfterValidator, BeforeValidator, Field, PlainSerializer, Strict

from config.part import Part, unusable, wrong

POISSON = "poisson"

Threshold = Annotated[float, Field(gt=0.0, lt=1.0, description="a number above 0 and below 1")]
Window = Annotated[int, Field(ge=1, le=10_000, description="a whole number from 1 to 10000")]
FewestCounts = Annotated[int, Field(ge=1, le=100_000, description="a whole number from 1 to 100000")]
MeanGap = Annotated[float, Field(ge=1.0, le=1e6, description="a number from 1 to 1000000")]
GapShape = Annotated[int, Field(ge=1, le=50, description="a whole number from 1 to 50")]
SmallestShift = Annotated[float, Field(ge=0.0, le=10.0, description="a number from 0 to 10, such as 0.15")]
OneOffShare = Annotated[float, Field(ge=0.0, le=0.5, description="a number from 0 to 0.5")]


def _dispersion(raw: Any) -> Any:
    if raw in (POISSON, math.inf):
        return math.inf
    if isinstance(raw, str):
        raise wrong(POISSON)
    return raw


def _write_dispersion(value: float) -> float | str:
    return value if math.isfinite(value) else POISSON


def _distinct(values: tuple[float, ...]) -> tuple[float, ...]:
    if len(set(values)) < len(values):
        raise unusable("a value twice")
    return values


def _distinct_wanders(pairs: tuple[tuple[float, float], ...]) -> tuple[tuple[float, float], ...]:
    _distinct(tuple(value for value, _ in pairs))
    return pairs


Dispersion = Annotated[
    float, BeforeValidator(_dispersion), PlainSerializer(_write_dispersion, when_used="json"), Field(gt=0.0)
]
Dispersions = Annotated[
    tuple[Dispersion, ...],
    Strict(False),
    AfterValidator(_distinct),
    Field(
        min_length=1,
        max_length=64,
        description=f'up to 64 different numbers above 0, where "{POISSON}" may stand for infinity',
    ),
]
WanderValue = Annotated[float, Field(ge=0.0, le=1.0)]
Weight = Annotated[float, Field(gt=0.0, allow_inf_nan=False)]
Wanders = Annotated[
    tuple[Annotated[tuple[WanderValue, Weight], Strict(False)], ...],
    Strict(False),
    AfterValidator(_distinct_wanders),
    Field(
        min_length=1,
        max_length=32,
        description="up to 32 pairs [value from 0 to 1, weight above 0] of different values",
    ),
]


class Judgement(Part):
    """When a shift is announced."""

    threshold: Threshold = 0.9
    window: Window = 40
    lasting: Window = 3
    fewest_counts: FewestCounts = 12


class JudgementChanges(Part):
    """What differs from the judgement that holds otherwise."""

    threshold: Threshold | None = None
    window: Window | None = None
    lasting: Window | None = None
    fewest_counts: FewestCounts | None = None


class Model(Part):
    """What is assumed of a stream. None leaves a list of values to the detectors."""

    mean_gap: MeanGap = 150.0
    gap_shape: GapShape = 2
    smallest_shift: SmallestShift = 0.15
    one_off_share: OneOffShare = 0.02
    wanders: Wanders | None = None
    dispersions: Dispersions | None = None


class ModelChanges(Part):
    """What differs from the model that holds otherwise."""

    mean_gap: MeanGap | None = None
    gap_shape: GapShape | None = None
    smallest_shift: SmallestShift | None = None
    one_off_share: OneOffShare | None = None
    wanders: Wanders | None = None
    dispersions: Dispersions | None = None


def changed_judgement(base: Judgement, changes: JudgementChanges | None) -> Judgement:
    """The judgement with the changes made."""
    return base if changes is None else base.model_copy(update=changes.model_dump(exclude_none=True))


def changed_model(base: Model, changes: ModelChanges | None) -> Model:
    """The model with the changes made."""
    return base if changes is None else base.model_copy(update=changes.model_dump(exclude_none=True))
