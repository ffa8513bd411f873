"""Signatures after the Standard Webhooks specification 1.0.0, made by its reference library."""

import base64
import binascii
import math
from datetime import UTC, datetime

from standardwebhooks import Webhook

PREFIX = "whsec_"
FEWEST_BYTES, MOST_BYTES = 24, 64


class UnusableSecret(ValueError):
    """A text that is no signing secret. The sentence never repeats it."""

    def __init__(self, why: str) -> None:
        super().__init__(
            f'A signing secret must be "{PREFIX}" followed by {FEWEST_BYTES} to {MOST_BYTES} random bytes in '
            f"base64; {why}. Take the one that the receiver gave you, or make one: "
            f"python3 -c \"import base64,os; print('{PREFIX}' + base64.b64encode(os.urandom(32)).decode())\""
        )


class Signer:
    """Signs bodies with one secret, which it never shows."""

    def __init__(self, secret: str) -> None:
        self._webhook = Webhook(key_of(secret))

    def headers(self, delivery_id: str, body: bytes, now: datetime) -> tuple[tuple[str, str], ...]:
        """The three headers for exactly these bytes, which must be UTF-8."""
        moment = now.astimezone(UTC)
        signature = self._webhook.sign(delivery_id, moment, body.decode("utf-8"))
        return (
            ("webhook-id", delivery_id),
            ("webhook-timestamp", str(math.floor(moment.timestamp()))),
            ("webhook-signature", signature),
        )

    def __repr__(self) -> str:
        return "Signer()"


def key_of(secret: str) -> bytes:
    """The key that a secret stands for.

    Raises
    ------
    UnusableSecret
        If it is none. The library would skip what is not base64 and sign with what is left.
    """
    text = secret.strip()
    if not text.startswith(PREFIX):
        raise UnusableSecret("got one that begins otherwise")
    coded = text.removeprefix(PREFIX).rstrip("=")
    try:
        key = base64.b64decode(coded + "=" * (-len(coded) % 4), validate=True)
    except (binascii.Error, ValueError):
        raise UnusableSecret("got one that is not base64 after it") from None
    if not FEWEST_BYTES <= len(key) <= MOST_BYTES:
        raise UnusableSecret(f"got one of {len(key)} bytes")
    return key
