"""The webhook against a real receiver on loopback, which verifies with the specification's own library."""

import json
import time
from datetime import UTC, datetime

import pytest
from standardwebhooks import Webhook as ReferenceVerifier

from service.outlets.outlet import Kind
from service.outlets.signing import Signer
from service.outlets.trial import SENTENCE, try_outlet
from service.outlets.webhook import Webhook

SECRET = "whsec_MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSw"
BODY = '{"sentence": "Wörter – 夜",  "odd spacing" : 1}'.encode()
TOKEN = "t0ken-in-the-address"


def hook(address: str, seconds: float = 5.0) -> Webhook:
    return Webhook("desk", f"{address}?token={TOKEN}", Signer(SECRET), time.monotonic, seconds)


def test_the_reference_verifier_accepts_exactly_the_bytes_that_were_given(receiver):
    outcome = hook(receiver.address).send("msg_1", BODY, datetime.now(UTC))
    assert (outcome.kind, outcome.status, outcome.error) == (Kind.DELIVERED, 200, None)
    (got,) = receiver.received
    assert got.body == BODY
    assert got.headers["content-type"] == "application/json"
    assert got.headers["webhook-id"] == "msg_1"
    assert ReferenceVerifier(SECRET).verify(got.body, got.headers) == json.loads(BODY)


@pytest.mark.parametrize(
    ("status", "kind"),
    [
        (204, Kind.DELIVERED),
        (500, Kind.TRY_LATER),
        (429, Kind.TRY_LATER),
        (404, Kind.REFUSED),
        (410, Kind.ENDED),
    ],
)
def test_statuses(receiver, answer, clock, status: int, kind: Kind):
    receiver.will(answer(status, (("retry-after", "30"),)))
    outcome = hook(receiver.address).send("msg_1", BODY, clock.now())
    assert (outcome.kind, outcome.status) == (kind, status)


@pytest.mark.parametrize("status", [301, 302, 303, 307, 308])
def test_a_redirect_is_not_followed(receiver, answer, clock, status: int):
    receiver.will(answer(status, (("location", "/elsewhere"),)))
    outcome = hook(receiver.address).send("msg_1", BODY, clock.now())
    assert (outcome.kind, outcome.status) == (Kind.REFUSED, status)
    assert len(receiver.received) == 1


def test_a_receiver_that_hangs_costs_no_more_than_the_deadline(receiver, answer, clock):
    receiver.will(answer(hang=True))
    began = time.monotonic()
    outcome = hook(receiver.address, 0.2).send("msg_1", BODY, clock.now())
    assert time.monotonic() - began < 3.0
    assert (outcome.kind, outcome.status) == (Kind.TRY_LATER, None)
    assert outcome.error == 'Outlet "desk" did not answer in full within 0.2 s.'


def test_a_connection_that_is_dropped_is_tried_later_and_once_at_a_time(receiver, answer, clock):
    receiver.will(answer(drop=True))
    outcome = hook(receiver.address).send("msg_1", BODY, clock.now())
    assert outcome.kind is Kind.TRY_LATER
    assert len(receiver.received) == 1


@pytest.mark.parametrize("address", ["http://127.0.0.1:1/alerts", "ftp://127.0.0.1/", "127.0.0.1"])
def test_no_sentence_and_no_repr_holds_the_address_or_the_secret(address: str, clock):
    outlet = hook(address)
    outcome = outlet.send("msg_1", BODY, clock.now())
    assert outcome.kind is Kind.TRY_LATER
    for text in (outcome.error, repr(outcome), repr(outlet), str(outlet)):
        assert not any(part in text for part in (TOKEN, "127.0.0.1", SECRET[6:]))


def test_a_trial_says_that_it_is_one(receiver):
    tried = try_outlet(hook(receiver.address), datetime.now(UTC))
    (got,) = receiver.received
    body = ReferenceVerifier(SECRET).verify(got.body, got.headers)
    assert (body["type"], body["outlet"], body["sentence"]) == ("trial", "desk", SENTENCE)
    assert "This is a trial: nothing has moved" in SENTENCE
    assert "invented figures" in SENTENCE
    assert got.headers["webhook-id"] == body["id"]
    assert body["id"].startswith("trial_")
    assert (tried.taken, tried.sentence) == (True, 'Outlet "desk" took the trial (status 200).')


def test_a_trial_that_fails_says_why(receiver, answer, clock):
    receiver.will(answer(403))
    tried = try_outlet(hook(receiver.address), clock.now())
    assert (tried.taken, tried.status) == (False, 403)
    assert "signing secret" in tried.sentence
