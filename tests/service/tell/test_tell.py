"""Telling against a real store: once, to whom it belongs, and never what was found in history."""

import datetime
import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

import service.tell.tell as telling
from service.tell.tell import Taker, delivery_id, tell_due
from storage.engine import Store, open_store
from storage.outbox import Delivery, list_deliveries
from storage.shifts import HISTORY, Shift, get_shift, record_shift
from storage.streams import SeenStream, hush_stream, see_streams

Make = Callable[..., Shift]
DESK = Taker("desk")


def keep(store: Store, *shifts: Shift) -> None:
    with store.writing() as conn:
        for shift in shifts:
            record_shift(conn, shift)


def outbox(store: Store) -> tuple[Delivery, ...]:
    with store.reading() as conn:
        return list_deliveries(conn)


def told(store: Store, shift_id: str) -> tuple[datetime.datetime | None, str | None]:
    with store.reading() as conn:
        shift = get_shift(conn, shift_id)
    return shift.told_utc, shift.told_how


def test_a_live_shift_becomes_one_message_an_outlet(store: Store, stored_shift: Make, clock) -> None:
    keep(store, stored_shift())
    assert tell_due(store, [DESK, Taker("archive")], clock) == 1
    messages = outbox(store)
    assert {message.outlet for message in messages} == {"desk", "archive"}
    assert len({message.id for message in messages}) == 2
    assert all(message.due_utc == clock.now() and message.shift_id == "shift_walks" for message in messages)
    assert told(store, "shift_walks") == (clock.now(), "sent")


def test_the_message_says_what_moved_and_since_when(store: Store, stored_shift: Make, clock) -> None:
    keep(store, stored_shift())
    tell_due(store, [DESK], clock)
    (message,) = outbox(store)
    alert = json.loads(message.body)
    assert alert["id"] == message.id
    assert alert["sentence"] == (
        "Evening Walks: the filtered level fell by about 39 %, from about 1,050 to about 640 counts per "
        "week, most probably from 2026-03-02 (90 %: between 2026-02-23 and 2026-03-09); "
        "probability of a recent shift 0.96."
    )


def test_telling_twice_tells_once(store: Store, stored_shift: Make, clock) -> None:
    keep(store, stored_shift())
    assert tell_due(store, [DESK], clock) == 1
    first = outbox(store)
    clock.move_on(datetime.timedelta(hours=1))
    assert tell_due(store, [DESK, Taker("new")], clock) == 0
    assert outbox(store) == first


def test_what_was_found_in_history_is_never_told(store: Store, stored_shift: Make, clock) -> None:
    keep(store, stored_shift(origin=HISTORY))
    assert tell_due(store, [DESK], clock) == 0
    assert outbox(store) == ()
    assert told(store, "shift_walks") == (None, None)


def test_an_outlet_gets_the_slates_that_it_takes(store: Store, stored_shift: Make, clock) -> None:
    keep(store, stored_shift("a", "north"), stored_shift("b", "south"), stored_shift("c", None))
    takers = [Taker("north", frozenset({"north"})), Taker("all"), Taker("nobody", frozenset())]
    assert tell_due(store, takers, clock) == 3
    got = {(message.outlet, message.shift_id) for message in outbox(store)}
    assert got == {("north", "shift_a"), ("all", "shift_a"), ("all", "shift_b"), ("all", "shift_c")}


def test_a_hushed_stream_is_recorded_and_not_sent(
    store: Store, stored_shift: Make, clock, caplog: pytest.LogCaptureFixture
) -> None:
    keep(store, stored_shift())
    with store.writing() as conn:
        hush_stream(conn, "walks", clock.now() + datetime.timedelta(days=1))
    with caplog.at_level("INFO", "knickpoint"):
        assert tell_due(store, [DESK], clock) == 1
    assert outbox(store) == ()
    assert told(store, "shift_walks") == (clock.now(), "hushed")
    assert "shift not sent, its stream is hushed" in caplog.messages


def test_a_hush_ends_at_its_instant(store: Store, stored_shift: Make, clock) -> None:
    keep(store, stored_shift())
    with store.writing() as conn:
        hush_stream(conn, "walks", clock.now())
    tell_due(store, [DESK], clock)
    assert told(store, "shift_walks")[1] == "sent"


def test_without_an_outlet_a_shift_is_marked_so_and_not_sent_later(
    store: Store, stored_shift: Make, clock, caplog: pytest.LogCaptureFixture
) -> None:
    keep(store, stored_shift())
    assert tell_due(store, [], clock) == 1
    assert told(store, "shift_walks") == (clock.now(), "no outlet")
    assert "shift not sent, no outlet takes its slate" in caplog.messages
    assert tell_due(store, [DESK], clock) == 0
    assert outbox(store) == ()


def test_the_id_of_a_message_is_that_of_outlet_and_shift() -> None:
    ids = {
        delivery_id(outlet, shift, "shift.emerging") for outlet in ("desk", "archive") for shift in ("1", "2")
    }
    assert len(ids) == 4
    assert delivery_id("desk", "1", "shift.emerging") in ids
    assert all(one.startswith("msg_") and len(one) == 28 for one in ids)


def test_a_crash_while_writing_leaves_nothing_half_told(
    store: Store, stored_shift: Make, clock, monkeypatch: pytest.MonkeyPatch
) -> None:
    keep(store, stored_shift("a"), stored_shift("b"))

    def breaks(*_args: object, **_named: object) -> int:
        raise KeyboardInterrupt

    with monkeypatch.context() as patched:
        patched.setattr(telling, "mark_told", breaks)
        with pytest.raises(KeyboardInterrupt):
            tell_due(store, [DESK], clock)
    assert outbox(store) == ()
    assert tell_due(store, [DESK], clock) == 2
    assert len(outbox(store)) == 2


def test_two_tellers_write_one_message(store: Store, stored_shift: Make, clock, tmp_path: Path) -> None:
    keep(store, stored_shift())
    with store.reading() as conn:
        before = telling.gather(conn)
    with open_store(str(tmp_path / "store.sqlite")) as other:
        assert tell_due(other, [DESK], clock) == 1
    clock.move_on(datetime.timedelta(minutes=1))
    # As if this one had read before the other wrote.
    assert sum(telling._tell_slate(store, untold, [DESK], clock) for untold in before.values()) == 0
    assert len(outbox(store)) == 1


def test_more_shifts_than_one_pass_holds_are_all_told(
    store: Store, stored_shift: Make, clock, monkeypatch: pytest.MonkeyPatch
) -> None:
    shift = stored_shift()
    keep(store, *(replace(shift, id=f"shift_{number:02}") for number in range(25)))
    monkeypatch.setattr("service.tell.gather.MOST_AT_ONCE", 10)
    assert tell_due(store, [DESK], clock) == 25
    assert len(outbox(store)) == 25


def test_titles_of_releases_reach_the_sentence(store: Store, stored_shift: Make, clock) -> None:
    shift = stored_shift()
    with store.writing() as conn:
        see_streams(
            conn,
            [SeenStream("walks", "plays", "walks", "Evening\nWalks\u202e", "house", "release")],
            now=clock.now(),
        )
    keep(store, replace(shift, figures={**shift.figures, "start_title": "The <b>Weir</b>\r\nPart 2"}))
    tell_due(store, [DESK], clock)
    alert = json.loads(outbox(store)[0].body)
    assert alert["sentence"].startswith("Evening Walks: the filtered level")
    assert (
        'counts per release, most probably from "The <b>Weir</b> Part 2" of 2026-03-02' in alert["sentence"]
    )
    assert alert["stream"]["unit"] == "release"


@pytest.mark.parametrize(
    "figures",
    [
        {},
        {"region": "x", "ready_utc": 3, "counts_since": "many", "start_title": 5},
        {"region": [None, {"key": "k"}, {"key": "k", "at": "soon"}], "ready_utc": "yesterday"},
    ],
)
def test_figures_that_lack_something_are_told_without_it(
    store: Store, stored_shift: Make, clock, figures: dict[str, object]
) -> None:
    keep(store, stored_shift(figures=figures, late=True))
    assert tell_due(store, [DESK], clock) == 1
    alert = json.loads(outbox(store)[0].body)
    assert "most probably from 2026-03-02; probability" in alert["sentence"]
    assert alert["figures"]["region"] == []
    assert alert["figures"]["counts_since"] is None
