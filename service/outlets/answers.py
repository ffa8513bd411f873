"""What an answer over HTTP means for a delivery. Pure.

Only 2xx is success. 410 ends the delivery at once. Redirects are not followed. Other answers of the 4xx kind,
and redirects, mean that people may have to mend something; 408, 425 and 429 only ask for another time, as all
of 5xx does. Both kinds are tried again on one schedule: a 404 may be a receiver that is being set up, and a
mistake in the settings gets mended; an alert given up at the first such answer would be lost.
"""

from collections.abc import Mapping
from datetime import datetime

from service.outlets.outlet import Kind, Outcome
from service.outlets.retry_after import retry_after_seconds

GONE = 410
ASK_FOR_ANOTHER_TIME = frozenset({408, 425, 429})
SENTENCES = {
    400: "it does not understand the alert",
    401: "it asks for a password or a token",
    403: "it refuses us; look at the signing secret and the address",
    404: "there is nothing at its address; look at the address",
    405: "its address takes no POST; look at the address",
    410: "it is gone for good, by its own word",
    413: "the alert is too large for it",
    422: "it does not take the alert as it is",
    429: "it has had too many calls",
    503: "it is out of service for now",
}


def outcome_of(named: str, status: int, headers: Mapping[str, str], now: datetime) -> Outcome:
    """The outcome of an attempt that got an answer. Header names are in lower case."""
    kind = kind_of(status)
    if kind is Kind.DELIVERED:
        return Outcome(kind, status)
    sentence = f"{named} answered {status}{_meaning(status)}."
    if kind is Kind.ENDED:
        return Outcome(kind, status, sentence)
    return Outcome(kind, status, sentence, retry_after_seconds(headers.get("retry-after"), now))


def kind_of(status: int) -> Kind:
    """Whether a status is success, a reason to try again, or the end."""
    if 200 <= status < 300:
        return Kind.DELIVERED
    if status == GONE:
        return Kind.ENDED
    if 300 <= status < 500 and status not in ASK_FOR_ANOTHER_TIME:
        return Kind.REFUSED
    return Kind.TRY_LATER


def _meaning(status: int) -> str:
    if 300 <= status < 400:
        return ": it redirects, and redirects are not followed; put the new address into the settings"
    return f": {SENTENCES[status]}" if status in SENTENCES else ""
