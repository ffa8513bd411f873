"""What is known of a shift when it is told: everything that words and figures are made of."""

import datetime
from dataclasses import dataclass
from typing import Literal

from detectors.posterior import Quantiles

At = datetime.date | datetime.datetime


@dataclass(frozen=True, slots=True)
class Marker:
    """One count of the stream: its key, its date, the title of its release, and its place on the axis."""

    key: str
    at: At
    title: str | None
    position: int


@dataclass(frozen=True, slots=True)
class ShiftStory:
    """A shift of one stream, as it was announced.

    `unit` is what one count covers ("week", "release"), None where that is not known. `region` holds 90 % of
    the probability of where the shift lies, in order of position. The levels are filtered ones: each rests on
    the counts that had come by then. `readable_utc` is when the announcing count was complete.
    """

    shift_id: str
    stream_id: str
    title: str
    slate: str | None
    shape: Literal["calendar", "release"]
    unit: str | None
    level_before: Quantiles
    level_after: Quantiles
    probability: float
    start: Marker
    region: tuple[Marker, ...]
    announced: Marker
    announced_utc: datetime.datetime
    readable_utc: datetime.datetime | None
    counts_since: int | None
    late: bool
    settings: str
    reading_id: int | None
