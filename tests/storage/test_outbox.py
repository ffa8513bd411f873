"""The outbox: due, tried, delivered or given up, sent again, always under one id and with one body."""

from datetime import datetime, timedelta

import pytest

from storage.engine import Store
from storage.errors import NoSuchRow
from storage.outbox import (
    Attempt,
    NewDelivery,
    add_delivery,
    claim_due,
    count_waiting,
    due_deliveries,
    get_delivery,
    give_up,
    list_attempts,
    list_deliveries,
    next_due,
    record_failure,
    record_last_failure,
    record_success,
    send_again,
)

HOUR = timedelta(hours=1)


def message(id: str, now: datetime, outlet: str = "hook", body: bytes = b'{"a":1}') -> NewDelivery:
    return NewDelivery(id=id, outlet=outlet, shift_id=None, body=body, created_utc=now, due_utc=now)


def failed(now: datetime, status: int | None = 503) -> Attempt:
    return Attempt(at_utc=now, outcome="failed", status=status, error="busy \x00", took_seconds=0.25)


def arrived(now: datetime) -> Attempt:
    return Attempt(at_utc=now, outcome="delivered", status=204, error=None, took_seconds=0.5)


def ids(deliveries) -> list[str]:
    return [one.id for one in deliveries]


def test_a_life_with_a_failure_and_a_success(store: Store, now: datetime):
    body = bytes(range(256))
    with store.writing() as conn:
        assert add_delivery(conn, message("msg_1", now, body=body))
        assert ids(due_deliveries(conn, now=now)) == ["msg_1"]
        assert due_deliveries(conn, now=now - HOUR) == ()
        record_failure(conn, "msg_1", failed(now), due_utc=now + HOUR)
        assert due_deliveries(conn, now=now) == ()
        waiting = get_delivery(conn, "msg_1")
        record_success(conn, "msg_1", arrived(now + HOUR))
        done = get_delivery(conn, "msg_1")
        assert list_attempts(conn, "msg_1") == (
            Attempt(now, "failed", 503, "busy \ufffd", 0.25),
            arrived(now + HOUR),
        )
    assert (waiting.state, waiting.attempts, waiting.due_utc) == ("waiting", 1, now + HOUR)
    assert (waiting.last_status, waiting.last_error) == (503, "busy \ufffd")
    assert (done.state, done.attempts, done.last_status, done.last_error) == ("delivered", 2, 204, None)
    assert done.body == body


def test_the_same_id_enters_once(store: Store, now: datetime):
    with store.writing() as conn:
        assert add_delivery(conn, message("msg_1", now))
        assert not add_delivery(conn, message("msg_1", now, body=b"other"))
        assert get_delivery(conn, "msg_1").body == b'{"a":1}'


def test_dead_letters_are_seen_and_sent_again_under_their_id(store: Store, now: datetime):
    with store.writing() as conn:
        add_delivery(conn, message("msg_1", now))
        add_delivery(conn, message("msg_2", now))
        record_last_failure(conn, "msg_1", failed(now, status=410))
        give_up(conn, "msg_2", why="the outlet is no longer in the settings")
        dead = list_deliveries(conn, state="given_up")
        assert {one.id: (one.last_status, one.attempts) for one in dead} == {
            "msg_1": (410, 1),
            "msg_2": (None, 0),
        }
        assert due_deliveries(conn, now=now + HOUR) == ()
        send_again(conn, "msg_1", now=now + HOUR)
        (again,) = due_deliveries(conn, now=now + HOUR)
        assert (again.id, again.attempts, again.body) == ("msg_1", 0, b'{"a":1}')
        assert len(list_attempts(conn, "msg_1")) == 1


def test_due_is_by_time_outlet_and_limit(store: Store, now: datetime):
    with store.writing() as conn:
        for number, outlet in enumerate(["hook", "mail", "hook"]):
            add_delivery(conn, message(f"msg_{number}", now - number * HOUR, outlet))
        assert ids(due_deliveries(conn, now=now)) == ["msg_2", "msg_1", "msg_0"]
        assert ids(due_deliveries(conn, now=now, limit=1)) == ["msg_2"]
        assert ids(due_deliveries(conn, now=now, outlet="hook")) == ["msg_2", "msg_0"]
        assert (count_waiting(conn), count_waiting(conn, outlet="mail")) == (3, 1)
        assert next_due(conn) == now - 2 * HOUR
        assert next_due(conn, outlet="mail") == now - HOUR
        assert next_due(conn, outlet="nobody") is None
        assert ids(list_deliveries(conn, outlet="hook")) == ["msg_0", "msg_2"]


def test_a_claimed_message_is_nobody_elses_until_its_time(store: Store, now: datetime):
    with store.writing() as conn:
        add_delivery(conn, message("msg_1", now))
        assert ids(claim_due(conn, now=now, until=now + HOUR)) == ["msg_1"]
    with store.writing() as conn:
        assert claim_due(conn, now=now, until=now + HOUR) == ()
        # The sender died: it comes back by itself.
        assert ids(claim_due(conn, now=now + HOUR, until=now + 2 * HOUR)) == ["msg_1"]


def test_unknown_ids(store: Store, now: datetime):
    with store.writing() as conn:
        for act in (
            lambda: get_delivery(conn, "msg_9"),
            lambda: record_success(conn, "msg_9", arrived(now)),
            lambda: send_again(conn, "msg_9", now=now),
            lambda: give_up(conn, "msg_9", why="x"),
        ):
            with pytest.raises(NoSuchRow, match="no delivery with the id 'msg_9'"):
                act()
