"""What a round needs to know, as the wiring fills it from the settings."""

import datetime
from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal
from zoneinfo import ZoneInfo

from detectors.judge import Rule
from detectors.model import Model
from service.round.calendar import Axis
from service.sources.plans import SourcePlan, fingerprint


@dataclass(frozen=True, slots=True)
class CalendarShape:
    """One count per interval. `settling` is how long after its end an interval's count waits."""

    axis: Axis
    absent: Literal["zero", "missing"]
    settling: datetime.timedelta = datetime.timedelta(0)


@dataclass(frozen=True, slots=True)
class ReleaseShape:
    """One count per release, taken when the release reaches its final age."""

    final: datetime.timedelta
    zone: ZoneInfo


Shape = CalendarShape | ReleaseShape


@dataclass(frozen=True, slots=True)
class StreamPlan:
    """One stream: what it is called, how its counts are placed, and how they are judged.

    `fingerprint` differs whenever the same readings would give other posteriors.
    """

    id: str
    source: str
    split: str | None
    title: str
    slate: str | None
    shape: Shape
    model: Model
    rule: Rule
    fingerprint: str


def shape_word(shape: Shape) -> Literal["calendar", "release"]:
    """The shape as it is stored."""
    return "calendar" if isinstance(shape, CalendarShape) else "release"


@dataclass(frozen=True, slots=True)
class RoundPlan:
    """One source: where it is read, how often, and which stream a split value means (None: left out).

    `sorting` differs whenever the rows of the same document would be sorted otherwise: into other streams, or
    under other keys. A document that is said to be unchanged is passed over only while it stays the same.
    """

    name: str
    source: SourcePlan
    every: datetime.timedelta
    stream_for: Callable[[str | None], StreamPlan | None]
    sorting: str = ""

    @property
    def about(self) -> str:
        """What a document's validators are good for."""
        return f"{fingerprint(self.source)} {self.sorting}".strip()
