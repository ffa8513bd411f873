"""Shifts: recorded once, told once, and found again by where they lie."""

from dataclasses import replace
from datetime import date, datetime, timedelta

import pytest

from detectors.posterior import Quantiles
from storage.engine import Store
from storage.errors import NoSuchRow, UnstorableValue
from storage.outbox import NewDelivery, add_delivery, list_deliveries
from storage.shifts import (
    Shift,
    get_shift,
    list_shifts,
    mark_told,
    overlapping_shifts,
    record_shift,
    set_state,
    untold_shifts,
)
from storage.streams import SeenStream, see_streams


def a_shift(id: str, now: datetime, **more) -> Shift:
    usual = Shift(
        id=id,
        stream_id="quay",
        origin="live",
        state="emerging",
        announced_key="e44",
        announced_position=44,
        announced_at=date(2026, 3, 1),
        announced_utc=now,
        start_key="e40",
        start_position=40,
        start_at=date(2026, 2, 1),
        region=(39, 40, 42),
        probability=0.97,
        level_before=Quantiles(900.0, 1000.0, 1100.0),
        level_after=Quantiles(500.0, 600.0, 700.0),
        late=False,
        fingerprint="f",
        reading_id=None,
        figures={"effect": [0.5, 0.6, 0.7], "note": None},
    )
    return replace(usual, **more)


def test_what_was_recorded_is_read(store: Store, stream: str, now: datetime):
    shift = a_shift("s1", now, late=True)
    with store.writing() as conn:
        assert record_shift(conn, shift)
    with store.reading() as conn:
        assert get_shift(conn, "s1") == shift
        assert list_shifts(conn, stream_id=stream) == (shift,)
        with pytest.raises(NoSuchRow, match="no shift with the id 's2'"):
            get_shift(conn, "s2")


@pytest.mark.usefixtures("stream")
def test_the_same_id_is_recorded_once(store: Store, now: datetime):
    with store.writing() as conn:
        assert record_shift(conn, a_shift("s1", now))
        mark_told(conn, ["s1"], now=now, how="sent")
        assert not record_shift(conn, a_shift("s1", now, probability=0.5))
        assert get_shift(conn, "s1").probability == 0.97
        assert untold_shifts(conn) == ()


@pytest.mark.usefixtures("stream")
def test_only_live_shifts_wait_to_be_told(store: Store, now: datetime):
    with store.writing() as conn:
        record_shift(conn, a_shift("old", now, origin="history"))
        record_shift(conn, a_shift("b", now + timedelta(hours=1)))
        record_shift(conn, a_shift("a", now + timedelta(hours=2)))
        record_shift(conn, a_shift("c", now))
        assert [one.id for one in untold_shifts(conn)] == ["c", "b", "a"]
        assert [one.id for one in untold_shifts(conn, limit=1)] == ["c"]
        assert mark_told(conn, ["c", "b"], now=now, how="hushed") == 2
        assert mark_told(conn, ["c", "b", "nobody"], now=now + timedelta(days=1), how="sent") == 0
        assert mark_told(conn, [], now=now, how="sent") == 0
        told = get_shift(conn, "c")
        assert (told.told_utc, told.told_how) == (now, "hushed")
        assert [one.id for one in untold_shifts(conn)] == ["a"]


@pytest.mark.usefixtures("stream")
def test_told_mark_and_outbox_stand_or_fall_together(store: Store, now: datetime):
    with store.writing() as conn:
        record_shift(conn, a_shift("s1", now))

    def tell_and_fail():
        with store.writing() as conn:
            add_delivery(conn, NewDelivery("msg_1", "hook", "s1", b"{}", now, now))
            mark_told(conn, ["s1"], now=now, how="sent")
            raise RuntimeError

    with pytest.raises(RuntimeError):
        tell_and_fail()
    with store.reading() as conn:
        assert list_deliveries(conn) == ()
        assert [one.id for one in untold_shifts(conn)] == ["s1"]


@pytest.mark.usefixtures("stream")
def test_states_are_those_of_the_glossary(store: Store, now: datetime):
    with store.writing() as conn:
        record_shift(conn, a_shift("s1", now))
        set_state(conn, "s1", "settled")
        assert get_shift(conn, "s1").state == "settled"
        with pytest.raises(NoSuchRow):
            set_state(conn, "s2", "settled")
    with pytest.raises(Exception, match="ck_shifts_state"), store.writing() as conn:
        set_state(conn, "s1", "forgotten")


def test_overlap_is_by_stream_and_region(store: Store, stream: str, now: datetime):
    with store.writing() as conn:
        see_streams(conn, [SeenStream("pier", "plays", "pier", "Pier", "house", "release")], now=now)
        record_shift(conn, a_shift("late", now, start_position=40, region=(39, 40, 42)))
        record_shift(conn, a_shift("early", now, start_position=20, region=(20,)))
        record_shift(conn, a_shift("bare", now, start_position=50, region=()))
        record_shift(conn, a_shift("other", now, stream_id="pier"))

        def found(first: int, last: int) -> list[str]:
            shifts = overlapping_shifts(conn, stream, first_position=first, last_position=last)
            return [one.id for one in shifts]

        assert found(42, 45) == found(30, 39) == ["late"]
        assert found(43, 49) == found(21, 38) == []
        assert found(0, 100) == ["early", "late", "bare"]


@pytest.mark.usefixtures("stream")
def test_lists_by_what_is_asked(store: Store, now: datetime):
    with store.writing() as conn:
        record_shift(conn, a_shift("a", now))
        record_shift(conn, a_shift("b", now + timedelta(hours=1), origin="history", state="settled"))
        assert [one.id for one in list_shifts(conn)] == ["b", "a"]
        assert [one.id for one in list_shifts(conn, limit=1)] == ["b"]
        assert [one.id for one in list_shifts(conn, origin="live")] == ["a"]
        assert [one.id for one in list_shifts(conn, state="settled")] == ["b"]


@pytest.mark.usefixtures("stream")
def test_figures_without_nan(store: Store, now: datetime):
    with pytest.raises(UnstorableValue, match="JSON can carry"), store.writing() as conn:
        record_shift(conn, a_shift("a", now, figures={"effect": float("nan")}))
