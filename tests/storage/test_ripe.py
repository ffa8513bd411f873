"""The ripe reading of a release stays the ripe one; the whole of a stream's readings can be gone through."""

from datetime import UTC, date, datetime, timedelta

import pytest
from sqlalchemy.exc import IntegrityError

from storage.engine import Store
from storage.readings import NewReading, all_readings, keep_readings, newest_at
from storage.ripe import note_ripe, point_ripe, ripe_readings
from storage.streams import SeenStream, see_streams


def read(store: Store, stream: str, now: datetime, **counts: int) -> None:
    with store.writing() as conn:
        rows = [NewReading(key, date(2026, 3, 1), count) for key, count in counts.items()]
        keep_readings(conn, stream, rows, now=now)


def ripe(store: Store, stream: str) -> dict[str, int | None]:
    with store.reading() as conn:
        return {one.key: one.count for one in ripe_readings(conn, stream)}


def test_what_is_ripe_first_stays(store: Store, stream: str, now: datetime):
    read(store, stream, now, a=1, b=2)
    with store.writing() as conn:
        assert note_ripe(conn, stream, ["a", "unknown"]) == 1
    read(store, stream, now + timedelta(days=1), a=5, b=6)
    with store.writing() as conn:
        assert note_ripe(conn, stream, ["a", "b"]) == 1
        assert note_ripe(conn, stream, ["a", "b"]) == 0
    assert ripe(store, stream) == {"a": 1, "b": 6}


def test_another_final_age_chooses_anew(store: Store, stream: str, now: datetime):
    read(store, stream, now, a=1, b=2)
    read(store, stream, now, a=5)
    with store.writing() as conn:
        note_ripe(conn, stream, ["a", "b"])
        first = all_readings(conn, stream)[0]
        point_ripe(conn, stream, {"a": first.id})
    assert ripe(store, stream) == {"a": 1}
    with store.writing() as conn:
        point_ripe(conn, stream, {})
    assert ripe(store, stream) == {}


def test_a_ripe_reading_must_be_there(store: Store, stream: str):
    with pytest.raises(IntegrityError, match="FOREIGN KEY"), store.writing() as conn:
        point_ripe(conn, stream, {"a": 99})


def test_all_readings_key_by_key(store: Store, stream: str, now: datetime):
    read(store, stream, now, b=1, a=2)
    read(store, stream, now, b=3)
    with store.reading() as conn:
        assert [(one.key, one.count) for one in all_readings(conn, stream)] == [("a", 2), ("b", 1), ("b", 3)]


def test_how_far_a_source_reaches(store: Store, stream: str, now: datetime):
    hourly = SeenStream("clicks", "web", None, "Clicks", None, "calendar")
    with store.writing() as conn:
        see_streams(conn, [hourly], now=now)
        assert newest_at(conn, "plays") is None
        days = [NewReading("x", date(2026, 3, 1), 1), NewReading("y", date(2026, 2, 1), 1)]
        keep_readings(conn, stream, days, now=now)
        hour = datetime(2026, 3, 2, 9, tzinfo=UTC)
        keep_readings(conn, "clicks", [NewReading("z", hour, 1)], now=now)
        assert newest_at(conn, "plays") == date(2026, 3, 1)
        assert newest_at(conn, "web") == hour
