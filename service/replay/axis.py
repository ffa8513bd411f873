"""The axis of a record: intervals of the calendar, or releases. Pure."""

from collections.abc import Sequence
from dataclasses import dataclass
from zoneinfo import ZoneInfo

from service.replay.errors import NoSpacing
from service.replay.places import Placed, place_intervals, place_releases
from service.replay.spacing import infer_interval
from service.replay.table import Entry, Table
from service.round.calendar import Interval, parse_interval

UTC = ZoneInfo("UTC")


@dataclass(frozen=True, slots=True)
class Spacing:
    """What was said of it: the name of an interval and a zone, or None."""

    interval: str | None = None
    zone: ZoneInfo | None = None


@dataclass(frozen=True, slots=True)
class OnAxis:
    """The rows with their places. `interval` is None for releases without a common spacing."""

    shape: str
    interval: Interval | None
    placed: tuple[Placed, ...]


def put_on_axis(table: Table, spacing: Spacing) -> OnAxis:
    """The rows on their axis: a named interval decides, then a column of releases, then the spacing.

    Raises
    ------
    UnusableInterval, ReplayError
        If no axis fits.
    """
    if spacing.interval is not None:
        return _on_calendar(table.entries, parse_interval(spacing.interval), spacing)
    if "release" in table.columns:
        return OnAxis("release", _spacing_if_any(table.entries), place_releases(table.entries))
    return _on_calendar(table.entries, infer_interval([entry.at for entry in table.entries]), spacing)


def _on_calendar(entries: Sequence[Entry], interval: Interval, spacing: Spacing) -> OnAxis:
    return OnAxis("calendar", interval, place_intervals(entries, interval, spacing.zone))


def _spacing_if_any(entries: Sequence[Entry]) -> Interval | None:
    try:
        return infer_interval([entry.at for entry in entries])
    except NoSpacing:
        return None
