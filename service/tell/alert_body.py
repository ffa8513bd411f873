"""The alert as JSON, for machines: the sentence and every figure behind it. Pure.

The form is published in `alert.schema.json`, which a test holds against the classes here. A form that takes
something away or changes a meaning gets another number in `schema`; one that adds fields keeps it.
"""

import dataclasses
import datetime
import json
import math
from typing import Annotated, Literal

from pydantic import Field

from detectors.posterior import Quantiles
from service.tell.plain import plain_or_none
from service.tell.story import At, Marker, ShiftStory
from service.tell.words import CAUTION, sentence, title_words

EMERGING_TYPE = "shift.emerging"
SCHEMA: Literal[1] = 1
REGION_PROBABILITY = 0.9

Figure = Annotated[float | None, Field(description="Null where it is not known.")]
Moment = Annotated[str, Field(description="An instant in UTC, as RFC 3339 writes it, ending in Z.")]
Day = Annotated[str, Field(description="A calendar day, or the first instant of an hour with its offset.")]


@dataclasses.dataclass(frozen=True, slots=True)
class StreamPart:
    """Which stream moved."""

    id: str
    title: str
    slate: str | None
    shape: Literal["calendar", "release"]
    unit: Annotated[str | None, Field(description="What one count covers: release, week, 14 days, ...")]


@dataclasses.dataclass(frozen=True, slots=True)
class ShiftPart:
    """Which shift this is; it keeps its id for good."""

    id: str
    state: Literal["emerging"]
    announced: Moment


@dataclasses.dataclass(frozen=True, slots=True)
class LevelPart:
    """The 5 %, 50 % and 95 % quantiles of a level, in counts per unit."""

    low: Figure
    mid: Figure
    high: Figure
    kind: Annotated[Literal["filtered"], Field(description="It rests on the counts that had come by then.")]


@dataclasses.dataclass(frozen=True, slots=True)
class MarkerPart:
    """One count: its key, its date, and the title of its release."""

    key: str
    at: Day
    title: str | None


@dataclasses.dataclass(frozen=True, slots=True)
class FiguresPart:
    """The figures behind the sentence."""

    level_before: LevelPart
    level_after: LevelPart
    recent_shift_probability: Figure
    start: Annotated[MarkerPart, Field(description="The most probable first count at the new level.")]
    region: Annotated[tuple[MarkerPart, ...], Field(description="Where it may have begun; may have gaps.")]
    region_probability: Annotated[float, Field(description="That it began there, if it did.")]
    announced: Annotated[MarkerPart, Field(description="The newest count when it was announced.")]
    counts_since: Annotated[int | None, Field(description="From the start on, the announcing one included.")]


@dataclasses.dataclass(frozen=True, slots=True)
class Alert:
    """One message about one shift to one outlet."""

    type: Literal["shift.emerging"]
    schema: Literal[1]
    id: Annotated[str, Field(description="The same however often it is sent, and in the header webhook-id.")]
    composed: Moment
    sentence: str
    caution: str
    late: Annotated[bool, Field(description="The counts had been there to be read long before.")]
    stream: StreamPart
    shift: ShiftPart
    figures: FiguresPart
    settings: Annotated[str, Field(description="Fingerprint of the settings and the model in force.")]
    reading: Annotated[int | None, Field(description="The newest reading of the stream then.")]


def alert_body(story: ShiftStory, delivery_id: str, composed: datetime.datetime) -> bytes:
    """The bytes that are stored, signed and sent."""
    document = dataclasses.asdict(alert(story, delivery_id, composed))
    return json.dumps(document, sort_keys=True, ensure_ascii=False, allow_nan=False).encode("utf-8")


def alert(story: ShiftStory, delivery_id: str, composed: datetime.datetime) -> Alert:
    """The alert for one outlet."""
    return Alert(
        type="shift.emerging",
        schema=SCHEMA,
        id=delivery_id,
        composed=_moment(composed),
        sentence=sentence(story),
        caution=CAUTION,
        late=story.late,
        stream=_stream(story),
        shift=ShiftPart(story.shift_id, "emerging", _moment(story.announced_utc)),
        figures=_figures(story),
        settings=story.settings,
        reading=story.reading_id,
    )


def _stream(story: ShiftStory) -> StreamPart:
    unit = "release" if story.shape == "release" else story.unit
    # The id and the slate go out as they are: receivers match on them.
    slate = None if story.slate is None else _sendable(story.slate)
    return StreamPart(_sendable(story.stream_id), title_words(story), slate, story.shape, unit)


def _figures(story: ShiftStory) -> FiguresPart:
    return FiguresPart(
        level_before=_level(story.level_before),
        level_after=_level(story.level_after),
        recent_shift_probability=_figure(story.probability),
        start=_marker(story.start),
        region=tuple(_marker(marker) for marker in story.region),
        region_probability=REGION_PROBABILITY,
        announced=_marker(story.announced),
        counts_since=story.counts_since,
    )


def _level(level: Quantiles) -> LevelPart:
    return LevelPart(_figure(level.low), _figure(level.mid), _figure(level.high), "filtered")


def _marker(marker: Marker) -> MarkerPart:
    return MarkerPart(_sendable(marker.key), _day(marker.at), plain_or_none(marker.title))


def _figure(value: float) -> float | None:
    return float(value) if math.isfinite(value) else None


def _sendable(text: str) -> str:
    return text.encode("utf-8", "replace").decode("utf-8")


def _day(at: At) -> str:
    return at.isoformat(timespec="minutes") if isinstance(at, datetime.datetime) else at.isoformat()


def _moment(instant: datetime.datetime) -> str:
    return instant.astimezone(datetime.UTC).isoformat(timespec="seconds").replace("+00:00", "Z")
