"""From the outbox to a real receiver that misbehaves. The clock is moved on by hand; nobody sleeps."""

import threading
import time
from datetime import timedelta

import pytest
from standardwebhooks import Webhook as Reference

from service.deliver.loop import Counts, deliver_all
from service.outlets.signing import Signer
from service.outlets.webhook import Webhook
from storage.engine import Store
from storage.outbox import get_delivery, list_attempts

SECRET = "whsec_MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSw"
GO_ON = threading.Event()


@pytest.fixture
def desk(receiver) -> Webhook:
    return Webhook("desk", receiver.address, Signer(SECRET), time.monotonic, 0.3)


def due_in(store: Store, clock, delivery_id: str) -> float:
    with store.reading() as conn:
        return (get_delivery(conn, delivery_id).due_utc - clock.now()).total_seconds()


def outcomes(store: Store, delivery_id: str) -> list[tuple[str, int | None]]:
    with store.reading() as conn:
        return [(made.outcome, made.status) for made in list_attempts(conn, delivery_id)]


def signature_holds(received, clock_instant) -> bool:
    """As `verify` of the reference library, but at the time of the clock that was passed in."""
    expected = Reference(SECRET).sign(
        received.headers["webhook-id"], clock_instant, received.body.decode("utf-8")
    )
    stamped = received.headers["webhook-timestamp"] == str(int(clock_instant.timestamp()))
    return stamped and received.headers["webhook-signature"].split(" ") == [expected]


def test_500_then_200_repeats_id_and_bytes_with_a_fresh_timestamp(
    tools, store, clock, put, receiver, answer, desk
):
    receiver.will(answer(500))
    put("msg_1", body='{"title": "Süden"}'.encode())
    first = clock.now()
    assert deliver_all(tools, [desk], GO_ON) == Counts(put_off=1)
    clock.move_on(timedelta(seconds=10))
    assert deliver_all(tools, [desk], GO_ON) == Counts(delivered=1)
    one, other = receiver.received
    assert (one.body, one.headers["webhook-id"]) == (other.body, other.headers["webhook-id"])
    assert signature_holds(one, first)
    assert signature_holds(other, clock.now())
    assert outcomes(store, "msg_1") == [("try later", 500), ("delivered", 200)]


def test_429_with_retry_after_in_seconds_and_as_a_date(tools, store, clock, put, receiver, answer, desk):
    receiver.will(
        answer(429, (("Retry-After", "90"),)),
        answer(503, (("Retry-After", "Mon, 16 Mar 2026 10:00:00 GMT"),)),
    )
    put("msg_1")
    deliver_all(tools, [desk], GO_ON)
    assert due_in(store, clock, "msg_1") == 90.0
    clock.move_on(timedelta(seconds=90))
    deliver_all(tools, [desk], GO_ON)
    assert due_in(store, clock, "msg_1") == 3600.0 - 90.0


def test_410_ends_it_at_once(tools, store, clock, put, receiver, answer, desk):
    receiver.will(answer(410))
    put("msg_1")
    assert deliver_all(tools, [desk], GO_ON) == Counts(given_up=1)
    clock.move_on(timedelta(days=30))
    assert deliver_all(tools, [desk], GO_ON) == Counts()
    assert outcomes(store, "msg_1") == [("given up", 410)]


@pytest.mark.parametrize("status", [400, 401, 403, 404, 413, 422, 301, 307])
def test_what_people_must_mend_is_tried_again(tools, store, clock, put, receiver, answer, desk, status):
    receiver.will(answer(status, (("location", "/elsewhere"),)))
    put("msg_1")
    assert deliver_all(tools, [desk], GO_ON) == Counts(put_off=1)
    assert due_in(store, clock, "msg_1") == 10.0
    assert outcomes(store, "msg_1") == [("refused", status)]
    assert [one.path for one in receiver.received] == ["/alerts"]


def test_hanging_up_and_hanging(tools, store, clock, put, receiver, answer, desk):
    receiver.will(answer(drop=True), answer(hang=True))
    put("msg_1")
    assert deliver_all(tools, [desk], GO_ON) == Counts(put_off=1)
    clock.move_on(timedelta(seconds=10))
    assert deliver_all(tools, [desk], GO_ON) == Counts(put_off=1)
    assert outcomes(store, "msg_1") == [("try later", None)] * 2
    clock.move_on(timedelta(seconds=30))
    assert deliver_all(tools, [desk], GO_ON) == Counts(delivered=1)


def test_a_receiver_that_hangs_does_not_delay_another(tools, clock, put, open_receiver, answer):
    slow, quick = open_receiver(), open_receiver()
    slow.will(answer(hang=True))
    put("msg_1", outlet="slow")
    put("msg_2", outlet="quick")
    outlets = [
        Webhook(name, place.address, Signer(SECRET), time.monotonic, 1.0)
        for name, place in (("slow", slow), ("quick", quick))
    ]
    order = []
    watched = type(tools)(tools.store, clock, tools.chance, lambda report: order.append(report.outlet))
    assert deliver_all(watched, outlets, GO_ON) == Counts(delivered=1, put_off=1)
    assert order == ["quick", "slow"]
