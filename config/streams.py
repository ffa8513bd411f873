"""What holds for one stream, after all that the file says of it."""

import datetime
import hashlib
import json
from dataclasses import asdict, dataclass
from typing import Any, Literal

from config.durations import write_duration
from config.judging import Judgement, Model, changed_judgement, changed_model
from config.settings import Settings
from config.sources import Source
from config.streams_part import CalendarStreams, ReleaseStreams, StreamChanges

FINGERPRINT_VERSION = 1
FINGERPRINT_LENGTH = 32


@dataclass(frozen=True, slots=True)
class Calendar:
    """One count per interval; `interval` is one of hour, day, "N days", week, month, year."""

    interval: str
    anchor: datetime.date
    absent: Literal["zero", "missing"]
    settling: datetime.timedelta


@dataclass(frozen=True, slots=True)
class Releases:
    """One count per release, at its final age."""

    final: datetime.timedelta


@dataclass(frozen=True, slots=True)
class StreamSettings:
    """What holds for one stream. Its id is the source's name, or that, a slash and the split value."""

    id: str
    source: str
    split: str | None
    title: str
    slate: str | None
    zone: str
    shape: Calendar | Releases
    judgement: Judgement
    model: Model


def stream_settings(settings: Settings, source: Source, split: str | None) -> StreamSettings | None:
    """What holds for the stream of a split value; None if that value is left out.

    A value that the file does not name is a stream like the others, by the template.
    """
    if split is not None and split in source.leave_out:
        return None
    template, changes = source.streams, _changes(source, split)
    judgement = changed_judgement(settings.judgement, template.judgement)
    model = changed_model(settings.model, template.model)
    return StreamSettings(
        id=source.name if split is None else f"{source.name}/{split}",
        source=source.name,
        split=split,
        title=changes.title or _title(template.title, source.name, split),
        slate=changes.slate or template.slate,
        zone=source.zone or settings.service.zone,
        shape=_shape(template),
        judgement=changed_judgement(judgement, changes.judgement),
        model=changed_model(model, changes.model),
    )


def fingerprint(stream: StreamSettings) -> str:
    """Differs whenever the same readings would give other posteriors or another judgement of them."""
    parts: dict[str, Any] = {
        "version": FINGERPRINT_VERSION,
        "zone": stream.zone,
        "shape": type(stream.shape).__name__,
        **{name: _written(value) for name, value in asdict(stream.shape).items()},
        "judgement": stream.judgement.model_dump(mode="json"),
        "model": stream.model.model_dump(mode="json"),
    }
    text = json.dumps(parts, sort_keys=True, allow_nan=False)
    return hashlib.sha256(text.encode()).hexdigest()[:FINGERPRINT_LENGTH]


def _changes(source: Source, split: str | None) -> StreamChanges:
    return source.changes.get(split, StreamChanges()) if split is not None else StreamChanges()


def _title(template: str | None, source: str, split: str | None) -> str:
    if template is None:
        return split or source
    return template.format(split=split or "", source=source)


def _shape(template: CalendarStreams | ReleaseStreams) -> Calendar | Releases:
    match template:
        case CalendarStreams():
            return Calendar(template.interval, template.anchor, template.absent, template.settling)
        case ReleaseStreams():
            return Releases(template.final)


def _written(value: object) -> object:
    return write_duration(value) if isinstance(value, datetime.timedelta) else str(value)
