"""Plans and readings by hand."""

import datetime
from collections.abc import Callable
from zoneinfo import ZoneInfo

import pytest

from detectors.judge import Rule
from detectors.model import Model
from service.round.calendar import Axis, Interval
from service.round.plans import CalendarShape, ReleaseShape, RoundPlan, StreamPlan
from service.sources.plans import FieldPlan, JsonPlan, WebPlace
from storage.readings import Reading

UTC = ZoneInfo("UTC")
MONDAY = datetime.date(2025, 1, 6)
RULE = Rule(threshold=0.9, window=40, lasting=4, fewest_counts=12)
MODEL = Model(dispersions=(4.0, 8.0, 16.0, 32.0, 64.0), wanders=((0.01, 1.0),))


def weekly(absent: str = "missing", settling_hours: float = 0.0, zone: str = "UTC") -> CalendarShape:
    settling = datetime.timedelta(hours=settling_hours)
    return CalendarShape(Axis(Interval("week"), ZoneInfo(zone)), absent, settling)  # type: ignore[arg-type]


@pytest.fixture
def weeks() -> Callable[..., CalendarShape]:
    return weekly


@pytest.fixture
def releases() -> Callable[..., ReleaseShape]:
    def shape(days: float = 7, zone: str = "UTC") -> ReleaseShape:
        return ReleaseShape(datetime.timedelta(days=days), ZoneInfo(zone))

    return shape


@pytest.fixture
def stream() -> Callable[..., StreamPlan]:
    def plan(
        shape: CalendarShape | ReleaseShape, split: str | None = "quay", mark: str = "one"
    ) -> StreamPlan:
        return StreamPlan(f"plays/{split}", "plays", split, "Quay", "house", shape, MODEL, RULE, mark)

    return plan


@pytest.fixture
def source(stream: Callable[..., StreamPlan]) -> Callable[..., RoundPlan]:
    """A source whose splits all have one shape; the split "no" is left out."""

    def plan(shape: CalendarShape | ReleaseShape, **changes: object) -> RoundPlan:
        read = JsonPlan("plays", WebPlace("http://house.invalid/"), "$[*]", FieldPlan("$.a", "$.c"), UTC)

        def stream_for(split: str | None) -> StreamPlan | None:
            return None if split == "no" else stream(shape, split, **changes)

        return RoundPlan("plays", read, datetime.timedelta(hours=1), stream_for)

    return plan


@pytest.fixture
def reading() -> Callable[..., Reading]:
    """A reading of a week by its number, or of a release by key and date."""

    def one(
        week: int = 0,
        count: int | None = 10,
        *,
        id: int | None = None,
        key: str | None = None,
        at: datetime.date | datetime.datetime | None = None,
        exposure: float | None = None,
        title: str | None = None,
        read: datetime.datetime = datetime.datetime(2026, 1, 1, tzinfo=UTC),
    ) -> Reading:
        day = MONDAY + datetime.timedelta(weeks=week) if at is None else at
        number = week + 1 if id is None else id
        return Reading(number, "plays/quay", key or day.isoformat(), day, title, count, exposure, read, 1)

    return one
