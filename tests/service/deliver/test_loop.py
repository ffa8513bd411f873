"""A pass over the outbox: what is sent, what is recorded, and what happens when things go wrong between."""

import threading
from datetime import timedelta

import pytest

from service.deliver.attempt import claim_next
from service.deliver.backoff import MOST_ATTEMPTS
from service.deliver.loop import MOST_IN_A_PASS, Counts, Tools, deliver_all, deliver_due, deliver_outlet
from service.outlets.outlet import Kind, Outcome
from storage.engine import Store
from storage.errors import StoreBusy
from storage.outbox import get_delivery, list_attempts, send_again

GO_ON = threading.Event()
DOWN = Outcome(Kind.TRY_LATER, 500, "It answered 500.")


def stands(store: Store, delivery_id: str):
    with store.reading() as conn:
        return get_delivery(conn, delivery_id)


def attempts(store: Store, delivery_id: str):
    with store.reading() as conn:
        return list_attempts(conn, delivery_id)


def test_what_is_due_is_sent_once_with_its_id_and_bytes(tools, store, clock, told, put):
    desk = told("desk")
    put("msg_1", body=b"\x00\xffas is")
    assert deliver_all(tools, [desk], GO_ON) == Counts(delivered=1)
    assert desk.sent == [("msg_1", b"\x00\xffas is", clock.now())]
    assert stands(store, "msg_1").state == "delivered"
    assert deliver_all(tools, [desk], GO_ON) == Counts()
    assert len(desk.sent) == 1


def test_a_failure_is_recorded_and_tried_again_when_it_is_due(tools, store, clock, told, put, reports):
    desk = told("desk", [DOWN])
    put("msg_1")
    assert deliver_all(tools, [desk], GO_ON) == Counts(put_off=1)
    waiting = stands(store, "msg_1")
    assert (waiting.state, waiting.attempts, waiting.last_status) == ("waiting", 1, 500)
    assert waiting.due_utc == clock.now() + timedelta(seconds=10)
    clock.move_on(timedelta(seconds=9))
    assert deliver_all(tools, [desk], GO_ON) == Counts()
    clock.move_on(timedelta(seconds=1))
    assert deliver_all(tools, [desk], GO_ON) == Counts(delivered=1)
    assert [made.outcome for made in attempts(store, "msg_1")] == ["try later", "delivered"]
    assert [report.outcome for report in reports] == ["try later", "delivered"]
    assert [sent[0] for sent in desk.sent] == ["msg_1", "msg_1"]


def test_it_is_given_up_visibly_and_can_be_sent_again(tools, store, clock, told, put):
    desk = told("desk", [DOWN] * MOST_ATTEMPTS)
    put("msg_1")
    counts = Counts()
    for _ in range(MOST_ATTEMPTS + 3):
        counts += deliver_all(tools, [desk], GO_ON)
        clock.move_on(timedelta(days=2))
    assert counts == Counts(put_off=MOST_ATTEMPTS - 1, given_up=1)
    given_up = stands(store, "msg_1")
    assert (given_up.state, given_up.last_error) == ("given_up", "It answered 500.")
    assert attempts(store, "msg_1")[-1].outcome == "given up"
    with store.writing() as conn:
        send_again(conn, "msg_1", now=clock.now())
    assert deliver_all(tools, [desk], GO_ON) == Counts(delivered=1)
    assert {sent[:2] for sent in desk.sent} == {("msg_1", b'{"a":1}')}


def test_what_was_sent_again_by_hand_has_all_its_attempts_anew(tools, store, clock, told, put):
    desk = told("desk", [Outcome(Kind.ENDED, 410, "Gone."), DOWN])
    put("msg_1")
    assert deliver_all(tools, [desk], GO_ON) == Counts(given_up=1)
    with store.writing() as conn:
        send_again(conn, "msg_1", now=clock.now())
    assert deliver_all(tools, [desk], GO_ON) == Counts(put_off=1)
    assert stands(store, "msg_1").attempts == 1


def test_an_outlet_that_raises_is_recorded_without_the_text_of_the_error(tools, store, told, put):
    desk = told("desk", [RuntimeError("http://secret.example/t0ken")])
    put("msg_1")
    put("msg_2")
    assert deliver_all(tools, [desk], GO_ON) == Counts(delivered=1, put_off=1)
    error = stands(store, "msg_1").last_error
    assert error.startswith("Unexpected RuntimeError in conftest.py, line ")
    assert "secret" not in error


def test_no_transaction_is_open_while_a_message_is_on_its_way(tools, store, told, put):
    def write_meanwhile() -> None:
        thread_done = threading.Event()

        def write() -> None:
            with store.writing() as conn:
                conn.exec_driver_sql("UPDATE deliveries SET last_error = 'seen' WHERE id = 'msg_2'")
            thread_done.set()

        threading.Thread(target=write).start()
        assert thread_done.wait(2.0)

    put("msg_1")
    put("msg_2", outlet="elsewhere")
    assert deliver_all(tools, [told("desk", before=write_meanwhile)], GO_ON) == Counts(delivered=1, strays=1)
    assert stands(store, "msg_2").last_error == "seen"


def test_a_crash_between_send_and_record_repeats_the_delivery_under_its_id(tools, store, clock, told, put):
    class Killed(BaseException):
        pass

    desk = told("desk")
    put("msg_1")

    def die() -> float:
        if desk.sent:
            raise Killed
        return 0.0

    clock_of_the_dead = type("Dying", (), {"now": clock.now, "monotonic": staticmethod(die)})()
    with pytest.raises(Killed):
        deliver_outlet(Tools(store, clock_of_the_dead, lambda: 0.0, print), desk, GO_ON)
    assert attempts(store, "msg_1") == ()
    assert deliver_all(tools, [desk], GO_ON) == Counts(), "it is still claimed by the dead process"
    clock.move_on(timedelta(seconds=20))
    assert deliver_all(tools, [desk], GO_ON) == Counts(delivered=1)
    assert [sent[:2] for sent in desk.sent] == [("msg_1", b'{"a":1}')] * 2


def test_two_processes_do_not_send_the_same_message_at_once(store, clock, told, put):
    put("msg_1")
    one, other = told("desk"), told("desk")
    assert claim_next(store, one, clock, clock.now()).id == "msg_1"
    assert claim_next(store, other, clock, clock.now()) is None


def test_a_database_that_cannot_record_leaves_the_message_waiting(store, clock, told, put):
    desk = told("desk")
    put("msg_1")

    class Locked:
        reading = store.reading

        def writing(self):
            if desk.sent:
                raise StoreBusy("here", 1.0)
            return store.writing()

    with pytest.raises(StoreBusy):
        deliver_outlet(Tools(Locked(), clock, lambda: 0.0, print), desk, GO_ON)
    assert stands(store, "msg_1").state == "waiting"


def test_nothing_begins_after_the_stop(tools, store, told, put):
    stop = threading.Event()
    desk = told("desk", before=stop.set)
    put("msg_1")
    put("msg_2")
    assert deliver_all(tools, [desk], stop) == Counts(delivered=1)
    assert stands(store, "msg_2").attempts == 0
    assert deliver_all(tools, [desk], stop) == Counts()


def test_a_pass_is_bounded(tools, store, clock, told):
    from storage.outbox import NewDelivery, add_delivery

    with store.writing() as conn:
        for number in range(MOST_IN_A_PASS + 5):
            name = f"msg_{number}"
            add_delivery(conn, NewDelivery(name, "desk", None, b"", clock.now(), clock.now()))
    desk = told("desk")
    assert deliver_all(tools, [desk], GO_ON) == Counts(delivered=MOST_IN_A_PASS)
    assert deliver_all(tools, [desk], GO_ON) == Counts(delivered=5)


def test_a_slow_outlet_delays_no_other(tools, told, put):
    others_done = threading.Event()
    waited = []
    slow = told("slow", before=lambda: waited.append(others_done.wait(5.0)))
    quick = [told(f"quick {number}") for number in range(5)]
    quick[-1].before = others_done.set
    put("msg_slow", outlet="slow")
    for outlet in quick:
        put(f"msg_{outlet.name}", outlet=outlet.name)
    assert deliver_all(tools, [slow, *quick], GO_ON) == Counts(delivered=6)
    assert waited == [True]


def test_a_receiver_that_says_when_to_come_back_is_left_alone_with_all_its_messages(
    tools, store, clock, told, put
):
    desk = told("desk", [Outcome(Kind.TRY_LATER, 429, "It answered 429.", 60.0)])
    other = told("other")
    for name in ("msg_1", "msg_2", "msg_3"):
        put(name)
    put("msg_4", outlet="other")
    assert deliver_all(tools, [desk, other], GO_ON) == Counts(delivered=1, put_off=1)
    clock.move_on(timedelta(seconds=59))
    assert deliver_all(tools, [desk, other], GO_ON) == Counts()
    assert [stands(store, name).attempts for name in ("msg_1", "msg_2", "msg_3")] == [1, 0, 0]
    clock.move_on(timedelta(seconds=1))
    assert deliver_all(tools, [desk, other], GO_ON) == Counts(delivered=3)


def test_without_outlets_everything_waits(tools, put):
    put("msg_1")
    assert deliver_all(tools, [], GO_ON) == Counts(strays=1)


def test_messages_of_an_outlet_that_left_the_settings_wait_until_it_comes_back(
    tools, store, clock, told, put, caplog
):
    put("msg_1", outlet="old desk")
    clock.move_on(timedelta(days=400))
    assert deliver_all(tools, [told("desk")], GO_ON) == Counts(strays=1)
    assert stands(store, "msg_1").state == "waiting"
    (line,) = caplog.records
    assert (line.getMessage(), line.facts) == (
        "deliveries wait for outlets that are not in the settings",
        {"outlets": "old desk", "waiting": 1},
    )
    assert deliver_all(tools, [told("old desk")], GO_ON) == Counts(delivered=1)


def test_one_call_makes_a_whole_pass_and_says_so_in_the_log(store, clock, told, put, caplog):
    outlets = [told("desk"), told("other", [DOWN]), told("third", [Outcome(Kind.ENDED, 410, "Gone.")])]
    for number, outlet in enumerate(outlets):
        put(f"msg_{number}", outlet=outlet.name)
    caplog.set_level("INFO", "knickpoint")
    assert deliver_due(store, outlets, clock, lambda: 0.0) == Counts(delivered=1, put_off=1, given_up=1)
    lines = {record.facts["outlet"]: (record.levelname, record.facts["why"]) for record in caplog.records}
    assert lines == {
        "desk": ("INFO", None),
        "other": ("WARNING", "It answered 500."),
        "third": ("ERROR", "Gone."),
    }
