"""Signatures against the vectors of the Standard Webhooks specification."""

import base64
from datetime import UTC, datetime, timedelta, timezone

import pytest
from standardwebhooks import Webhook, WebhookVerificationError

from service.outlets.signing import Signer, UnusableSecret, key_of

# Standard Webhooks 1.0.0, vector of the specification's reference tests.
SECRET = "whsec_MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSw"
ID = "msg_p5jXN8AQM9LWM0D4loKWxJek"
TIMESTAMP = 1614265330
PAYLOAD = b'{"test": 2432232314}'
SIGNATURE = "v1,g0hM9SsE+OTPJTGt/tmIKtSyZlE3uFJELVlNIOLJ1OE="


def signed(secret: str, delivery_id: str, body: bytes, timestamp: int) -> dict[str, str]:
    return dict(Signer(secret).headers(delivery_id, body, datetime.fromtimestamp(timestamp, UTC)))


def test_the_vector_of_the_specification():
    assert signed(SECRET, ID, PAYLOAD, TIMESTAMP) == {
        "webhook-id": ID,
        "webhook-timestamp": str(TIMESTAMP),
        "webhook-signature": SIGNATURE,
    }


def test_the_minified_example_of_the_specification():
    # Payload, id and timestamp: Standard Webhooks 1.0.0, its example; signature recomputed with hmac.
    body = (
        b'{"type":"contact.created","timestamp":"2022-11-03T20:26:10.344522Z",'
        b'"data":{"id":"1f81eb52-5198-4599-803e-771906343485"}}'
    )
    headers = signed(SECRET, "msg_2KWPBgLlAfxdpx2AI54pPJ85f4W", body, 1674087231)
    assert headers["webhook-signature"] == "v1,ARw42xaAApl/nxRo+iPGYwSaMQaOwMo2eyH5JBRA+bQ="


def test_the_key_is_what_stands_behind_the_prefix():
    key = bytes(range(1, 26))
    assert key_of("whsec_" + base64.b64encode(key).decode()) == key


def test_the_time_is_utc_whatever_the_zone_and_never_rounded_up():
    plus_nine = datetime.fromtimestamp(TIMESTAMP, timezone(timedelta(hours=9))) + timedelta(milliseconds=999)
    headers = dict(Signer(SECRET).headers(ID, PAYLOAD, plus_nine))
    assert headers["webhook-timestamp"] == str(TIMESTAMP)
    assert headers["webhook-signature"] == SIGNATURE


def test_bytes_outside_ascii_are_signed_as_they_are():
    body = '{"title":"Spätlese – 夜"}'.encode()
    now = datetime.now(UTC)
    headers = dict(Signer(SECRET).headers("msg_1", body, now))
    assert Webhook(SECRET).verify(body, headers) == {"title": "Spätlese – 夜"}
    with pytest.raises(WebhookVerificationError):
        Webhook(SECRET).verify(body.replace(b" ", b"  ", 1), headers)


@pytest.mark.parametrize(
    ("secret", "why"),
    [
        ("", "begins otherwise"),
        ("hunter2-hunter2-hunter2-hunter2", "begins otherwise"),
        ("whsec_", "0 bytes"),
        ("whsec_" + base64.b64encode(b"x" * 23).decode(), "23 bytes"),
        ("whsec_" + base64.b64encode(b"x" * 65).decode(), "65 bytes"),
        ("whsec_$$$MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSw", "not base64"),
        ("whsec_MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSwé", "not base64"),
    ],
)
def test_an_unusable_secret_is_refused_and_not_repeated(secret: str, why: str):
    with pytest.raises(UnusableSecret) as caught:
        Signer(secret)
    assert why in str(caught.value)
    assert len(secret) < 12 or secret.removeprefix("whsec_")[:12] not in str(caught.value)
    assert caught.value.__cause__ is None


def test_a_secret_may_lack_its_padding_and_have_a_line_end():
    coded = base64.b64encode(b"k" * 25).decode()
    assert key_of(f" whsec_{coded.rstrip('=')}\n") == b"k" * 25


def test_a_signer_does_not_show_its_secret():
    assert repr(Signer(SECRET)) == "Signer()"
