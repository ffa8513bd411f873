"""Which streams come out of a source: the template for all, and what differs for single ones."""

import datetime
from typing import Annotated, Literal

from pydantic import Field, Tag

from config.calendar_words import Interval
from config.durations import Age
from config.judging import JudgementChanges, ModelChanges
from config.part import TAG, Part, chosen_by
from config.words import Slate, Title, TitleTemplate

ANCHOR = datetime.date(1970, 1, 1)
SHAPES = ("calendar", "release")


class StreamsCommon(Part):
    """What streams of both shapes have."""

    slate: Slate | None = None
    title: TitleTemplate | None = None
    judgement: JudgementChanges | None = None
    model: ModelChanges | None = None


class CalendarStreams(StreamsCommon):
    """One count per interval."""

    shape: Literal["calendar"]
    interval: Interval
    absent: Literal["zero", "missing"] = Field(
        description='"zero" (an interval without a row had no counts) or "missing" (nobody knows)'
    )
    anchor: datetime.date = Field(
        default=ANCHOR, description="a date without quotes, such as 2026-03-02, from which days are counted"
    )
    settling: Age = datetime.timedelta(0)


class ReleaseStreams(StreamsCommon):
    """One count per release, taken at its final age."""

    shape: Literal["release"]
    final: Age


Streams = Annotated[
    Annotated[CalendarStreams, Tag(f"{TAG}calendar")] | Annotated[ReleaseStreams, Tag(f"{TAG}release")],
    chosen_by("shape", SHAPES),
]


class StreamChanges(Part):
    """What differs for one stream."""

    slate: Slate | None = None
    title: Title | None = None
    judgement: JudgementChanges | None = None
    model: ModelChanges | None = None
