"""Which place on the axis each row has. Pure."""

import datetime
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import TypeVar
from zoneinfo import ZoneInfo

from detectors.observation import Observation
from service.replay.errors import SamePlace
from service.replay.spacing import At, wall_date
from service.replay.table import Entry
from service.round.calendar import UTC, Axis, Interval, label_of, position_of

ONE_ROW = "Needed is one row for each; leave one out, or name a shorter interval with --interval."
ONE_RELEASE = "Needed is one row for each release; leave one out."


@dataclass(frozen=True, slots=True)
class Placed:
    """A row with its observation."""

    index: int
    observation: Observation


One = TypeVar("One", Entry, Placed)


def place_intervals(
    entries: Sequence[Entry], interval: Interval, zone: ZoneInfo | None
) -> tuple[Placed, ...]:
    """The rows of a calendar stream, earliest first.

    Without a zone an instant counts for the date that is written in the file; with one, for the date that
    it has there.

    Raises
    ------
    SamePlace
        If two rows fall into one interval.
    """
    first = min(wall_date(entry.at) for entry in entries)
    axis = Axis(interval, zone or ZoneInfo("UTC"), first)
    placed = sorted(
        (_place(entry, position_of(axis, _at(entry.at, interval, zone))) for entry in entries), key=_position
    )
    _require_different(
        placed, _position, lambda one: f"the {interval} {label_of(axis, _position(one))}", ONE_ROW
    )
    return tuple(placed)


def place_releases(entries: Sequence[Entry]) -> tuple[Placed, ...]:
    """The rows of a release stream in the order in which they came out; those of one moment as in the file.

    Raises
    ------
    SamePlace
        If a release comes twice.
    """
    by_name = sorted(entries, key=lambda entry: (entry.release or "", entry.index))
    _require_different(by_name, _release, lambda entry: f"the release {_release(entry)!r}", ONE_RELEASE)
    ordered = sorted(entries, key=lambda entry: (_moment(entry.at), entry.index))
    return tuple(_place(entry, number) for number, entry in enumerate(ordered))


def _place(entry: Entry, position: int) -> Placed:
    return Placed(entry.index, Observation(position, entry.count, entry.exposure))


def _at(at: At, interval: Interval, zone: ZoneInfo | None) -> At:
    return at if zone is not None or interval.unit == "hour" else wall_date(at)


def _moment(at: At) -> datetime.datetime:
    return (
        at if isinstance(at, datetime.datetime) else datetime.datetime(at.year, at.month, at.day, tzinfo=UTC)
    )


def _position(one: Placed) -> int:
    return one.observation.position


def _release(entry: Entry) -> str | None:
    return entry.release


def _require_different(
    ordered: Iterable[One], key: Callable[[One], object], name: Callable[[One], str], remedy: str
) -> None:
    for before, after in pairwise(ordered):
        if key(before) == key(after):
            first, second = sorted((before.index, after.index))
            raise SamePlace(first, second, name(before), remedy)
