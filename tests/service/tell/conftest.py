"""A story and a recorded shift of an invented show."""

import datetime
from collections.abc import Callable
from dataclasses import replace

import pytest

from detectors.posterior import Quantiles
from service.tell.story import Marker, ShiftStory
from storage.engine import Store
from storage.shifts import EMERGING, LIVE, Shift
from storage.streams import SeenStream, see_streams

NOW = datetime.datetime(2026, 3, 23, 6, 0, tzinfo=datetime.UTC)
FIRST_WEEK = datetime.date(2026, 2, 23)


def week(number: int) -> Marker:
    """A week by its number from 2026-02-23 on."""
    monday = FIRST_WEEK + datetime.timedelta(weeks=number)
    return Marker(monday.isoformat(), monday, None, 100 + number)


@pytest.fixture
def weeks() -> Callable[[int], Marker]:
    return week


@pytest.fixture
def story() -> ShiftStory:
    """A weekly show that fell."""
    return ShiftStory(
        shift_id="shift_1",
        stream_id="walks",
        title="Evening Walks",
        slate="house",
        shape="calendar",
        unit="week",
        level_before=Quantiles(1010.0, 1047.0, 1085.0),
        level_after=Quantiles(590.0, 636.0, 690.0),
        probability=0.9634,
        start=week(1),
        region=(week(0), week(1), week(2)),
        announced=week(3),
        announced_utc=NOW,
        readable_utc=NOW,
        counts_since=3,
        late=False,
        settings="f1",
        reading_id=7,
    )


@pytest.fixture
def stored_shift(store: Store) -> Callable[..., Shift]:
    """Puts a stream and a live shift of it into the store (not the row, the caller records it)."""

    def make(stream: str = "walks", slate: str | None = "house", **changes: object) -> Shift:
        seen = SeenStream(stream, "plays", stream, "Evening Walks", slate, "calendar")
        with store.writing() as conn:
            see_streams(conn, [seen], now=NOW - datetime.timedelta(days=300))
        return replace(_shift(stream), **changes)  # type: ignore[arg-type]

    return make


def _shift(stream: str) -> Shift:
    start, announced = week(1), week(3)
    region = [{"key": m.key, "at": m.at.isoformat(), "title": None} for m in (week(0), week(1), week(2))]
    return Shift(
        id=f"shift_{stream}",
        stream_id=stream,
        origin=LIVE,
        state=EMERGING,
        announced_key=announced.key,
        announced_position=announced.position,
        announced_at=announced.at,
        announced_utc=NOW,
        start_key=start.key,
        start_position=start.position,
        start_at=start.at,
        region=(100, 101, 102),
        probability=0.9634,
        level_before=Quantiles(1010.0, 1047.0, 1085.0),
        level_after=Quantiles(590.0, 636.0, 690.0),
        late=False,
        fingerprint="f1",
        reading_id=None,
        figures={
            "region": region,
            "start_title": None,
            "announced_title": None,
            "ready_utc": NOW.isoformat(),
            "counts_since": 3,
        },
    )
