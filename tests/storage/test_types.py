"""Values come back as what they were, or are refused; nothing turns into something else without a word."""

import sqlite3
from datetime import UTC, date, datetime, timedelta, timezone

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from sqlalchemy import insert, select, text

from storage.engine import Store
from storage.errors import DamagedRow, UnstorableValue
from storage.readings import NewReading, keep_readings, newest_readings
from storage.streams import find_stream, hush_stream
from storage.tables import readings, streams
from storage.types import at_text, clean_text, instant_text, json_text, real, whole

instants = st.datetimes(
    # Hypothesis wants its bounds without a zone.
    min_value=datetime(1, 1, 3),  # noqa: DTZ001
    max_value=datetime(9999, 12, 29),  # noqa: DTZ001
    timezones=st.timezones(),
)


@given(instants)
def test_instant_text_is_exact_utc_of_one_width(instant: datetime):
    written = instant_text(instant)
    # Compared in UTC: across zones Python calls times in a gap of the local clock unequal to everything.
    assert datetime.fromisoformat(written) == instant.astimezone(UTC)
    assert len(written) == 27


@given(instants, instants)
def test_text_order_is_time_order(one: datetime, other: datetime):
    assert (instant_text(one) < instant_text(other)) == (one.astimezone(UTC) < other.astimezone(UTC))


def test_the_ends_of_the_calendar_are_refused():
    with pytest.raises(UnstorableValue, match="years 1 to 9999"):
        instant_text(datetime.max.replace(tzinfo=timezone(timedelta(hours=-1))))


NAIVE = datetime(2026, 3, 2)  # noqa: DTZ001


@pytest.mark.parametrize("value", [NAIVE, date(2026, 3, 2), "2026-03-02T00:00:00Z", 0])
def test_only_aware_instants(value):
    with pytest.raises(UnstorableValue, match="an instant with its time zone"):
        instant_text(value)


def test_a_day_stays_a_day_and_a_naive_time_is_refused():
    assert at_text(date(2026, 3, 2)) == "2026-03-02"
    with pytest.raises(UnstorableValue):
        at_text(NAIVE)


@pytest.mark.parametrize("value", [np.int64(2**53), np.int32(7), np.uint8(7), 7, 0, -3])
def test_whole_numbers_become_python_integers(value):
    assert type(whole(value)) is int
    assert whole(value) == value


@pytest.mark.parametrize(
    "value", [True, np.bool_(True), 7.0, np.float64(7), "7", None, 2**53 + 1, -(2**53) - 1]
)
def test_what_is_no_whole_number_is_refused(value):
    with pytest.raises(UnstorableValue, match="a whole number"):
        whole(value)


@pytest.mark.parametrize("value", [np.float64(0.25), np.float32(0.25), 1, np.int64(3)])
def test_numbers_become_python_floats(value):
    assert type(real(value)) is float
    assert real(value) == value


@pytest.mark.parametrize("value", [float("nan"), float("inf"), np.nan, True, "1", None])
def test_what_is_no_finite_number_is_refused(value):
    with pytest.raises(UnstorableValue, match="a finite number"):
        real(value)


def test_json_without_nan_and_the_same_bytes_for_the_same_value():
    assert json_text({"b": 1, "a": [None, "ü"]}) == '{"a":[null,"\\u00fc"],"b":1}'
    with pytest.raises(UnstorableValue, match="JSON can carry"):
        json_text({"a": float("nan")})


def test_numpy_integers_are_integers_in_the_file(store: Store, place: str, stream: str, now):
    rows = [NewReading("e1", date(2026, 3, 1), np.int64(2**53), exposure=np.float64(0.5))]
    with store.writing() as conn:
        keep_readings(conn, stream, rows, now=now)
    with sqlite3.connect(place) as raw:
        found = raw.execute("SELECT typeof(count), count, typeof(exposure) FROM readings").fetchall()
    raw.close()
    assert found == [("integer", 2**53, "real")]


@pytest.mark.usefixtures("stream")
def test_the_trap_that_the_types_close(place: str):
    # sqlite3 hands numpy.int64 over as eight bytes; a STRICT table refuses them even past our types.
    row = (
        "INSERT INTO readings (stream_id, key, at, count, read_utc) VALUES ('quay', 'k', '2026-03-01', ?, '')"
    )
    with (
        sqlite3.connect(place) as raw,
        pytest.raises(sqlite3.IntegrityError, match="cannot store BLOB value"),
    ):
        raw.execute(row, (np.int64(5),))
    raw.close()


def test_our_error_comes_through_unwrapped(store: Store, stream: str):
    with pytest.raises(UnstorableValue, match="its time zone"), store.writing() as conn:
        hush_stream(conn, stream, NAIVE)
    with pytest.raises(UnstorableValue, match="without NUL"), store.reading() as conn:
        find_stream(conn, "qu\x00ay")


def test_an_instant_of_any_zone_comes_back_in_utc(store: Store, stream: str):
    there = datetime(2026, 3, 2, 23, 30, tzinfo=timezone(timedelta(hours=-5)))
    with store.writing() as conn:
        hush_stream(conn, stream, there)
    with store.reading() as conn:
        found = find_stream(conn, stream).hushed_until_utc
    assert found == there
    assert found.tzinfo is UTC


def test_days_and_instants_come_back_as_such(store: Store, stream: str, now):
    rows = [NewReading("d", date(2026, 3, 1), 1), NewReading("i", datetime(2026, 3, 1, 9, tzinfo=UTC), 2)]
    with store.writing() as conn:
        keep_readings(conn, stream, rows, now=now)
        found = [reading.at for reading in newest_readings(conn, stream)]
    assert found == [date(2026, 3, 1), datetime(2026, 3, 1, 9, tzinfo=UTC)]
    assert type(found[0]) is date


@given(st.text())
def test_clean_text_is_taken_by_the_database(words: str):
    cleaned = clean_text(words)
    assert "\x00" not in cleaned
    assert cleaned.encode("utf-8").decode("utf-8") == cleaned
    assert clean_text(cleaned) == cleaned


def test_odd_titles_are_kept_and_not_taken_for_changes(store: Store, stream: str, now):
    rows = [NewReading("e1", date(2026, 3, 1), 5, title="half \ud83d and \x00 nothing")]
    with store.writing() as conn:
        assert keep_readings(conn, stream, rows, now=now).stored == 1
        assert keep_readings(conn, stream, rows, now=now).unchanged == 1


def test_a_row_changed_by_hand_is_called_damaged(store: Store, stream: str):
    with store.writing() as conn:
        conn.execute(text("UPDATE streams SET first_read_utc = 'yesterday'"))
    with pytest.raises(DamagedRow, match="should be an instant, but is 'yesterday'"), store.reading() as conn:
        find_stream(conn, stream)


def test_values_for_in_lists_go_through_the_types(store: Store, stream: str, now):
    with store.writing() as conn:
        keep_readings(conn, stream, [NewReading("e1", date(2026, 3, 1), 5)], now=now)
        found = conn.scalars(select(readings.c.key).where(readings.c.count.in_([np.int64(5)]))).all()
        assert found == ["e1"]
        with pytest.raises(Exception, match="ck_streams_shape"):
            conn.execute(
                insert(streams).values(
                    id="x",
                    source="s",
                    title="t",
                    shape="square",
                    first_read_utc=now,
                    last_seen_utc=now,
                    epoch=0,
                )
            )
