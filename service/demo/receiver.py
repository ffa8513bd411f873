"""The invented house's desk: takes alerts and lets in only those whose signature is right."""

import datetime
import hmac
import json
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from http import HTTPStatus
from queue import SimpleQueue
from typing import Any

from standardwebhooks import Webhook

from service.clock import Clock
from service.demo.loopback import Handler, serving

PATH = "/alerts"
LARGEST_ALERT = 1_000_000
OLDEST_SECONDS = 300.0
HEADERS = ("webhook-id", "webhook-timestamp", "webhook-signature")


@dataclass(frozen=True, slots=True)
class Received:
    """An alert as it arrived, under its stable id."""

    id: str
    stream_id: str
    sentence: str
    caution: str


Arrivals = SimpleQueue[Received]


@contextmanager
def desk(clock: Clock, secret: str, arrivals: Arrivals) -> Iterator[str]:
    """Take alerts for as long as the block lasts; gives the address for them."""
    webhook = Webhook(secret)

    class Desk(Handler):
        def do_POST(self) -> None:  # noqa: N802  The name is given by http.server.
            length = int(self.headers.get("Content-Length") or 0)
            if self.path != PATH or not 0 < length <= LARGEST_ALERT:
                self.answer(HTTPStatus.BAD_REQUEST)
                return
            body = self.rfile.read(length)
            given = {name: self.headers.get(name, "") for name in HEADERS}
            if not is_genuine(webhook, given, body, clock):
                self.answer(HTTPStatus.UNAUTHORIZED)
                return
            arrivals.put(_received(given["webhook-id"], json.loads(body)))
            self.answer(HTTPStatus.NO_CONTENT)

    with serving(Desk) as address:
        yield address + PATH


def _received(id: str, alert: Mapping[str, Any]) -> Received:
    return Received(id, alert["stream"]["id"], alert["sentence"], alert["caution"])


def is_genuine(webhook: Webhook, headers: Mapping[str, str], body: bytes, clock: Clock) -> bool:
    """Whether these very bytes were signed with our secret, and not long ago.

    The library's `verify` holds the time stamp against the machine's clock, but the demo's alerts bear the
    time of its fast one. So the library signs again what came, and the outcome is compared with the signature
    that came; the time stamp is held against the fast clock, with the five real minutes that `verify` allows.
    """
    try:
        stamp = datetime.datetime.fromtimestamp(int(headers["webhook-timestamp"]), datetime.UTC)
        expected = webhook.sign(headers["webhook-id"], stamp, body.decode("utf-8"))
    except (ValueError, OverflowError, OSError):
        return False
    if abs(clock.real_seconds(clock.now() - stamp)) > OLDEST_SECONDS:
        return False
    came = headers["webhook-signature"].split(" ")
    return any(hmac.compare_digest(expected.encode(), one.encode()) for one in came)
