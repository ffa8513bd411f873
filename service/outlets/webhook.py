"""The webhook: a signed POST of JSON to an address."""

from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import datetime

from service.calls import FetchError, Post
from service.http_client import post
from service.outlets.answers import outcome_of
from service.outlets.outlet import Kind, Outcome
from service.outlets.signing import Signer

ATTEMPT_SECONDS = 15.0
LARGEST_ANSWER = 4096


@dataclass(frozen=True, slots=True)
class Webhook:
    """An address that takes alerts as JSON, signed after the Standard Webhooks specification.

    The bytes are signed and sent exactly as they came from the outbox. The address is a secret: sentences
    call the outlet by its name.
    """

    name: str
    address: str = field(repr=False)
    signer: Signer = field(repr=False)
    monotonic: Callable[[], float] = field(repr=False)
    attempt_seconds: float = ATTEMPT_SECONDS

    def send(self, delivery_id: str, body: bytes, now: datetime) -> Outcome:
        """One POST, without redirects and without a second try."""
        named = f'Outlet "{self.name}"'
        headers = (("content-type", "application/json"), *self.signer.headers(delivery_id, body, now))
        try:
            answer = post(
                Post(self.address, body, named, headers),
                deadline_seconds=self.attempt_seconds,
                monotonic=self.monotonic,
                largest_body=LARGEST_ANSWER,
            )
        except FetchError as error:
            return Outcome(Kind.TRY_LATER, error=str(error))
        return outcome_of(named, answer.status, answer.headers, now)
