"""JSON over HTTP: all pages of a document, then its rows."""

import json
from collections.abc import Iterator
from dataclasses import replace
from decimal import Decimal

from service.calls import Answer, Deadline, Fetch, FetchError, Monotonic
from service.http_client import Session, join, same_origin
from service.sources.document import Document, KeptOut, Row, Validators
from service.sources.errors import SourceUnreadable, UnusablePath
from service.sources.json_path import compile_path, nodes
from service.sources.json_rows import rows_of
from service.sources.link_header import next_reference
from service.sources.plans import JsonPlan, LinkHeader, NextAddress, WebPlace, fingerprint
from service.sources.rows import RowRules
from service.sources.web import first_call, require_success, secrets_of, validators_of

ACCEPT = "application/json, */*;q=0.5"
LONGEST_INTEGER = 400


def read_json(plan: JsonPlan, validators: Validators, monotonic: Monotonic) -> Document:
    """The document, or word that it is the one we have.

    Raises
    ------
    SourceUnreadable
        If any part of it cannot be read.
    """
    request = first_call(plan.place, ACCEPT, validators)
    with Session(Deadline.after(plan.bounds.deadline_seconds, monotonic)) as session:
        first = _fetched(plan, session, request, plan.bounds.largest_body)
        if first.status == 304 and (validators.etag or validators.last_modified):
            return Document(not_modified=True, validators=validators)
        pages = list(_pages(plan, session, request, first))
    rules = RowRules(plan.zone, secrets_of(plan.place))
    return _document(rows_of(plan, pages, rules), _validators(plan, first, len(pages)))


def _document(understood: list[Row | KeptOut], validators: Validators) -> Document:
    return Document(
        tuple(one for one in understood if isinstance(one, Row)),
        tuple(one for one in understood if isinstance(one, KeptOut)),
        validators=validators,
    )


def _validators(plan: JsonPlan, first: Answer, pages: int) -> Validators:
    """None where an unchanged first page would not prove the whole unchanged."""
    if pages > 1 or isinstance(plan.paging, LinkHeader):
        return Validators()
    return validators_of(first, fingerprint(plan))


def _pages(plan: JsonPlan, session: Session, request: Fetch, answer: Answer) -> Iterator[object]:
    """Each page parsed, from the first answer to the last; a page that is missing ends the whole."""
    seen = {request.address, answer.address}
    left = plan.bounds.largest_body
    for number in range(1, plan.bounds.most_pages + 1):
        require_success(answer, plan.name, request.named)
        page = _parsed(plan, answer.body, number)
        yield page
        address = _next_address(plan, answer, page, number)
        if address is None:
            return
        _require_progress(plan, address, seen, number)
        left -= len(answer.body)
        answer = _fetched(plan, session, _onward(plan, request, answer, address, number), left)
        seen |= {address, answer.address}


def _require_progress(plan: JsonPlan, address: str, seen: set[str], number: int) -> None:
    if address in seen:
        raise _unreadable(plan, f"page {number} names a page as the next that was read already.")
    if number == plan.bounds.most_pages:
        raise _unreadable(plan, f"it has more than the {number} pages that are allowed.")


def _fetched(plan: JsonPlan, session: Session, request: Fetch, largest_body: int) -> Answer:
    try:
        return session.fetch(request, largest_body=largest_body)
    except FetchError as error:
        sentence = str(error)
    raise _unreadable(plan, sentence)


def _parsed(plan: JsonPlan, body: bytes, number: int) -> object:
    try:
        # NaN and Infinity are no JSON, but programs write them: they cost their row, not the document.
        return json.loads(body, parse_int=_integer)
    except RecursionError:
        why = "is nested too deeply"
    except UnicodeDecodeError:
        why = "is not encoded in UTF-8, as JSON must be"
    except ValueError as error:
        why = f"is no JSON ({error})" if body.strip() else "is empty where JSON was expected"
    raise _unreadable(plan, f"page {number} of its answer {why}.")


def _integer(digits: str) -> int | Decimal:
    """Digits without end are no reason to lose the document: the row with them is kept out by itself."""
    return int(digits) if len(digits) <= LONGEST_INTEGER else Decimal(digits)


def _next_address(plan: JsonPlan, answer: Answer, page: object, number: int) -> str | None:
    reference = _next_reference(plan, answer, page, number)
    if reference is None:
        return None
    try:
        return join(answer.address, reference)
    except ValueError:
        pass
    raise _unreadable(plan, f"what page {number} names as the next page is no http or https address.")


def _next_reference(plan: JsonPlan, answer: Answer, page: object, number: int) -> str | None:
    match plan.paging:
        case LinkHeader():
            try:
                return next_reference(answer.headers.get("link", ""))
            except ValueError as error:
                why = str(error)
            raise _unreadable(plan, f"the Link header of page {number} cannot be taken apart: {why}.")
        case NextAddress(path):
            return _at_path(plan, path, page, number)
        case None:
            return None


def _at_path(plan: JsonPlan, path: str, page: object, number: int) -> str | None:
    try:
        found = nodes(compile_path(path), page)
    except UnusablePath as error:
        raise _unreadable(plan, str(error)) from None
    if not found or found in ([None], [""]):
        return None
    if len(found) > 1 or not isinstance(found[0], str):
        raise _unreadable(
            plan, f"{path} must give one address or null on page {number}; it gives something else."
        )
    return str(found[0])


def _onward(plan: JsonPlan, request: Fetch, answer: Answer, address: str, number: int) -> Fetch:
    """The call for a next page: never with a secret to another host, nor down from https."""
    if not same_origin(request.address, address) and _has_secrets(plan.place, request):
        raise _unreadable(
            plan, f"page {number} names a next page on another host, where its secrets do not go."
        )
    if answer.address.startswith("https:") and not address.startswith("https:"):
        raise _unreadable(plan, f"page {number} names a next page on plain http, where it was https.")
    conditions = ("If-None-Match", "If-Modified-Since")
    plain = tuple((name, value) for name, value in request.open_headers if name not in conditions)
    return replace(request, address=address, open_headers=plain)


def _has_secrets(place: WebPlace, request: Fetch) -> bool:
    return place.address_is_secret or bool(request.headers)


def _unreadable(plan: JsonPlan, why: str) -> SourceUnreadable:
    return SourceUnreadable(plan.name, why)
