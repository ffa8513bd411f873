"""A sender killed with a message on its way: nothing is lost, and the repeat has the same id and bytes."""

import subprocess
import sys
from datetime import timedelta
from pathlib import Path

import service
from service.clock import SystemClock
from service.deliver.loop import Counts, deliver_due
from service.outlets.signing import Signer
from service.outlets.webhook import Webhook
from storage.outbox import NewDelivery, add_delivery, get_delivery, list_attempts

SECRET = "whsec_MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSw"
BODY = '{"title":"Süden"}'.encode()
SENDER = """
import sys, time
from service.clock import SystemClock
from service.deliver.loop import deliver_due
from service.outlets.signing import Signer
from service.outlets.webhook import Webhook
from storage.engine import open_store

path, address, secret = sys.argv[1:]
desk = Webhook("desk", address, Signer(secret), time.monotonic)
with open_store(path) as store:
    deliver_due(store, [desk], SystemClock(), lambda: 0.0)
"""


def test_killed_between_sending_and_recording(store, clock, receiver, answer):
    clock.instant = SystemClock().now()
    receiver.will(answer(hang=True))
    with store.writing() as conn:
        add_delivery(conn, NewDelivery("msg_1", "desk", None, BODY, clock.now(), clock.now()))
    command = [sys.executable, "-c", SENDER, store.place, receiver.address, SECRET]
    with subprocess.Popen(command, cwd=Path(service.__file__).parents[1]) as sender:
        came = receiver.came.wait(30.0)
        sender.kill()
    assert came
    assert sender.returncode == -9
    with store.reading() as conn:
        assert get_delivery(conn, "msg_1").state == "waiting"
        assert list_attempts(conn, "msg_1") == ()
    clock.move_on(timedelta(minutes=2))
    desk = Webhook("desk", receiver.address, Signer(SECRET), SystemClock().monotonic)
    assert deliver_due(store, [desk], clock, lambda: 0.0) == Counts(delivered=1)
    assert [(got.headers["webhook-id"], got.body) for got in receiver.received] == [("msg_1", BODY)] * 2
