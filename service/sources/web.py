"""What JSON and CSV have in common when they come from an address."""

import base64
import re
from http import HTTPStatus
from urllib.parse import unquote, urlsplit, urlunsplit

from service.calls import Answer, Fetch
from service.http_client import host_of
from service.sources.document import Validators
from service.sources.errors import SourceUnreadable
from service.sources.plans import Headers, WebPlace

LONGEST_VALIDATOR = 500
# Anything shorter guards nothing, and hiding it would make a text unreadable.
SHORTEST_SECRET = 6
SHORTEST_SECRET_PART = 8


def first_call(place: WebPlace, accept: str, validators: Validators) -> Fetch:
    """The call for a place; a login written into the address becomes a header."""
    address, login = _without_login(place.address)
    conditions = (("If-None-Match", validators.etag), ("If-Modified-Since", validators.last_modified))
    return Fetch(
        address,
        named="its address" if place.address_is_secret else host_of(address),
        headers=login + place.headers,
        open_headers=(("Accept", accept), *((name, value) for name, value in conditions if value)),
    )


def secrets_of(place: WebPlace) -> tuple[str, ...]:
    """Texts that a source must not get back onto the screen: whole values, and their longer parts."""
    whole = [value for _, value in place.headers]
    if place.address_is_secret:
        whole.append(place.address)
    parts = [part for text in whole for part in re.split(r"[\s/?&=;@:,]+", text)]
    login = urlsplit(place.address).password if "@" in place.address else None
    long_enough = [text for text in (*whole, login or "") if len(text) >= SHORTEST_SECRET]
    return tuple(dict.fromkeys(long_enough + [part for part in parts if len(part) >= SHORTEST_SECRET_PART]))


def require_success(answer: Answer, source: str, named: str) -> None:
    """Raise unless the answer is the document."""
    if 200 <= answer.status < 300:
        return
    advice = " Check its headers and address." if answer.status in (401, 403, 404) else ""
    raise SourceUnreadable(source, f"{named} answered {_status(answer.status)}.{advice}")


def validators_of(answer: Answer, fingerprint: str) -> Validators:
    """The validators of an answer, as far as they can be sent back."""
    return Validators(
        _sendable(answer.headers.get("etag")), _sendable(answer.headers.get("last-modified")), fingerprint
    )


def _status(status: int) -> str:
    try:
        return f"{status} ({HTTPStatus(status).phrase})"
    except ValueError:
        return str(status)


def _sendable(value: str | None) -> str | None:
    usable = value and value.isascii() and value.isprintable() and len(value) <= LONGEST_VALIDATOR
    return value if usable else None


def _without_login(address: str) -> tuple[str, Headers]:
    try:
        parts = urlsplit(address)
    except ValueError:
        return address, ()
    login, at, host = parts.netloc.rpartition("@")
    if not at:
        return address, ()
    encoded = base64.b64encode(unquote(login).encode()).decode("ascii")
    return urlunsplit(parts._replace(netloc=host)), (("Authorization", f"Basic {encoded}"),)
