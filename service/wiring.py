"""The one translator from what a person wrote to what computes, reads and sends."""

import hashlib
import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from zoneinfo import ZoneInfo

from config import sources as written
from config.judging import Judgement
from config.judging import Model as WrittenModel
from config.loading import load_settings
from config.secret import Secret, reveal
from config.settings import Settings
from config.streams import Calendar, StreamSettings, fingerprint, stream_settings
from detectors.gap_prior import GapPrior
from detectors.judge import Rule, prior_floor
from detectors.jump_prior import JumpPrior
from detectors.model import DISPERSIONS, MODEL_VERSION, WANDERS, Model
from service.accuracy import accuracy_for
from service.clock import SystemClock
from service.logs import Form, hide
from service.outlets.outlet import Outlet
from service.outlets.signing import Signer
from service.outlets.webhook import Webhook
from service.round.calendar import Axis, parse_interval
from service.round.plans import CalendarShape, ReleaseShape, RoundPlan, Shape, StreamPlan
from service.sources.plans import (
    Bounds,
    CsvPlan,
    FieldPlan,
    FilePlace,
    JsonPlan,
    LinkHeader,
    NextAddress,
    SourcePlan,
    SqlPlan,
    WebPlace,
)
from service.tell.tell import Taker


class UnusableThreshold(ValueError):
    """A threshold that would ring for ever, because counts that say nothing already reach it."""

    def __init__(self, where: str, threshold: float, floor: float) -> None:
        self.where, self.threshold, self.floor = where, threshold, floor
        super().__init__(
            f"{where}: the threshold must lie above {floor:.3f}, the recent shift probability of counts that "
            f"say nothing (it follows from window, lasting, mean_gap and gap_shape); got {threshold}. "
            "Raise the threshold or mean_gap, or narrow the window."
        )


@dataclass(frozen=True, slots=True)
class Wired:
    """Everything the running program needs, and no settings behind it."""

    database: str
    zone: ZoneInfo
    rounds: tuple[RoundPlan, ...]
    outlets: tuple[Outlet, ...]
    takers: tuple[Taker, ...]
    good_rounds: str | None = field(repr=False)
    stop_within_seconds: float
    log_form: Form
    log_level: str


def wire(path: Path, environ: Mapping[str, str]) -> Wired:
    """Read the settings and build what they describe; their secrets are kept out of every log line.

    Raises
    ------
    config.errors.SettingsError
        With all that is wrong with the file.
    UnusableThreshold
        If a threshold lies at or below its prior floor.
    """
    settings = load_settings(path, environ)
    hide(_secrets(settings))
    require_usable_thresholds(settings)
    service = settings.service
    return Wired(
        database=str(service.database),
        zone=ZoneInfo(service.zone),
        rounds=tuple(_round(settings, source) for source in settings.sources),
        outlets=tuple(
            Webhook(
                name=outlet.name,
                address=outlet.address.reveal(),
                signer=Signer(outlet.secret.reveal()),
                monotonic=SystemClock().monotonic,
                attempt_seconds=outlet.deadline.total_seconds(),
            )
            for outlet in settings.outlets
        ),
        takers=tuple(
            Taker(outlet.name, None if outlet.slates is None else frozenset(outlet.slates))
            for outlet in settings.outlets
        ),
        good_rounds=None if service.good_rounds_address is None else service.good_rounds_address.reveal(),
        stop_within_seconds=service.stop_within.total_seconds(),
        log_form=service.log_form,
        log_level=service.log_level,
    )


def require_usable_thresholds(settings: Settings) -> None:
    """Hold every threshold that the file states or implies against its prior floor."""
    for source in settings.sources:
        for split in (None, *source.changes):
            stream = stream_settings(settings, source, split)
            if stream is None:
                continue
            rule, model = rule_of(stream.judgement), model_of(stream.model, stream.judgement)
            floor = prior_floor(model.gap, rule)
            if rule.threshold <= floor:
                where = f'source "{source.name}"' + ("" if split is None else f', stream "{split}"')
                raise UnusableThreshold(where, rule.threshold, floor)


def rule_of(judgement: Judgement) -> Rule:
    """The rule that a judgement describes."""
    return Rule(judgement.threshold, judgement.window, judgement.lasting, judgement.fewest_counts)


def model_of(model: WrittenModel, judgement: Judgement) -> Model:
    """The model that the settings describe; runs within the window are kept one by one."""
    return Model(
        gap=GapPrior(model.gap_shape, model.mean_gap),
        one_off_share=model.one_off_share,
        jump=JumpPrior(smallest=math.log1p(model.smallest_shift)),
        dispersions=model.dispersions or DISPERSIONS,
        wanders=model.wanders or WANDERS,
        accuracy=accuracy_for(judgement.window),
    )


def stream_plan(stream: StreamSettings) -> StreamPlan:
    """What a round needs to know of a stream."""
    return StreamPlan(
        id=stream.id,
        source=stream.source,
        split=stream.split,
        title=stream.title,
        slate=stream.slate,
        shape=_shape(stream),
        model=model_of(stream.model, stream.judgement),
        rule=rule_of(stream.judgement),
        fingerprint=_fingerprint(stream),
    )


def _fingerprint(stream: StreamSettings) -> str:
    """Settings and model version together: either makes other posteriors of the same readings."""
    model = model_of(stream.model, stream.judgement)
    text = f"{fingerprint(stream)} {MODEL_VERSION} {model!r}"
    return hashlib.sha256(text.encode()).hexdigest()[:32]


def _shape(stream: StreamSettings) -> Shape:
    zone = ZoneInfo(stream.zone)
    if isinstance(stream.shape, Calendar):
        axis = Axis(parse_interval(stream.shape.interval), zone, stream.shape.anchor)
        return CalendarShape(axis, stream.shape.absent, stream.shape.settling)
    return ReleaseShape(stream.shape.final, zone)


def _round(settings: Settings, source: written.Source) -> RoundPlan:
    known: dict[str | None, StreamPlan | None] = {}

    def stream_for(split: str | None) -> StreamPlan | None:
        if split not in known:
            stream = stream_settings(settings, source, split)
            known[split] = None if stream is None else stream_plan(stream)
        return known[split]

    return RoundPlan(
        source.name, _source(settings, source), source.every, stream_for, _sorting(settings, source)
    )


def _sorting(settings: Settings, source: written.Source) -> str:
    """Differs whenever the same document would be sorted into other streams or under other keys."""
    template = source.streams.model_dump_json(exclude={"title", "slate", "judgement", "model"})
    text = f"{template} {sorted(source.leave_out)} {source.zone or settings.service.zone}"
    return hashlib.sha256(text.encode("utf-8", "surrogatepass")).hexdigest()[:8]


def _source(settings: Settings, source: written.Source) -> SourcePlan:
    zone = ZoneInfo(source.zone or settings.service.zone)
    fields = FieldPlan(**source.fields.model_dump())
    bounds = _bounds(source)
    match source:
        case written.JsonSource():
            return JsonPlan(
                source.name,
                _web(source.address, source.headers),
                source.rows,
                fields,
                zone,
                _paging(source.paging),
                bounds,
            )
        case written.CsvSource():
            place = source.place
            where = FilePlace(place) if isinstance(place, Path) else _web(place, source.headers)
            return CsvPlan(source.name, where, fields, zone, source.delimiter, source.encoding, bounds)
        case written.SqlSource():
            return SqlPlan(source.name, reveal(source.address), source.query, fields, zone, bounds)


def _web(address: str | Secret, headers: Mapping[str, str | Secret]) -> WebPlace:
    plain = tuple((name, reveal(value)) for name, value in headers.items())
    return WebPlace(reveal(address), plain, isinstance(address, Secret))


def _paging(paging: str | written.NextAddress | None) -> LinkHeader | NextAddress | None:
    if isinstance(paging, written.NextAddress):
        return NextAddress(paging.next)
    return None if paging is None else LinkHeader()


def _bounds(source: written.Source) -> Bounds:
    plain = Bounds()
    return Bounds(
        deadline_seconds=source.deadline.total_seconds(),
        largest_body=source.largest_body,
        most_pages=source.most_pages if isinstance(source, written.JsonSource) else plain.most_pages,
        most_rows=source.most_rows,
    )


def _secrets(settings: Settings) -> Iterator[str]:
    for outlet in settings.outlets:
        yield outlet.address.reveal()
        yield outlet.secret.reveal()
    if settings.service.good_rounds_address is not None:
        yield settings.service.good_rounds_address.reveal()
    for source in settings.sources:
        values: list[object] = [getattr(source, "address", None), *getattr(source, "headers", {}).values()]
        yield from (value.reveal() for value in values if isinstance(value, Secret))
