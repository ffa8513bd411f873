"""CSV of RFC 4180 with a header line, from a file or an address."""

import codecs
import csv
import hashlib
import io
import os
import stat
from collections.abc import Iterator

from service.calls import FetchError, Monotonic
from service.http_client import fetch
from service.sources.document import Document, KeptOut, Row, Validators
from service.sources.errors import SourceUnreadable
from service.sources.plans import CsvPlan, FilePlace, WebPlace, fingerprint
from service.sources.rows import RowRules, keep_out, understand
from service.sources.table import columns_of
from service.sources.web import first_call, require_success, secrets_of, validators_of

ACCEPT = "text/csv, */*;q=0.5"


def read_csv(plan: CsvPlan, validators: Validators, monotonic: Monotonic) -> Document:
    """The table, or word that it is the one we have.

    Raises
    ------
    SourceUnreadable
        If the table as a whole cannot be read.
    """
    if isinstance(plan.place, WebPlace):
        found = _from_web(plan, plan.place, validators, monotonic)
    else:
        found = _from_file(plan, plan.place, validators)
    if found is None:
        return Document(not_modified=True, validators=validators)
    body, current = found
    understood = list(_understood(plan, _text(plan, body)))
    return Document(
        tuple(one for one in understood if isinstance(one, Row)),
        tuple(one for one in understood if isinstance(one, KeptOut)),
        validators=current,
    )


def _from_web(
    plan: CsvPlan, place: WebPlace, validators: Validators, monotonic: Monotonic
) -> tuple[bytes, Validators] | None:
    request = first_call(place, ACCEPT, validators)
    try:
        answer = fetch(
            request,
            deadline_seconds=plan.bounds.deadline_seconds,
            largest_body=plan.bounds.largest_body,
            monotonic=monotonic,
        )
    except FetchError as error:
        sentence = str(error)
    else:
        if answer.status == 304 and (validators.etag or validators.last_modified):
            return None
        require_success(answer, plan.name, request.named)
        return answer.body, validators_of(answer, fingerprint(plan))
    raise _unreadable(plan, sentence)


def _from_file(plan: CsvPlan, place: FilePlace, validators: Validators) -> tuple[bytes, Validators] | None:
    """The file's bytes, known again by their digest: a time stamp can stay the same over two writes."""
    try:
        body = _bytes_of(plan, place)
    except OSError as error:
        why = f"{place.path} cannot be opened: {error.strerror or type(error).__name__}."
    else:
        etag = f"sha256-{hashlib.sha256(body).hexdigest()}"
        return None if etag == validators.etag else (body, Validators(etag, None, fingerprint(plan)))
    raise _unreadable(plan, why)


def _bytes_of(plan: CsvPlan, place: FilePlace) -> bytes:
    with open(place.path, "rb", opener=_without_waiting) as file:
        descriptor = file.fileno()
        before = os.fstat(descriptor)
        if not stat.S_ISREG(before.st_mode):
            raise _unreadable(plan, f"{place.path} is no ordinary file.")
        body = file.read(plan.bounds.largest_body + 1)
        after = os.fstat(descriptor)
    if len(body) > plan.bounds.largest_body:
        raise _unreadable(
            plan, f"{place.path} has more than the {plan.bounds.largest_body} bytes that are allowed."
        )
    if (before.st_mtime_ns, before.st_size) != (after.st_mtime_ns, after.st_size):
        raise _unreadable(plan, f"{place.path} was written to while it was read; the next round tries again.")
    return body


def _without_waiting(path: str, flags: int) -> int:
    """Opening a pipe that nobody writes to would wait for ever."""
    return os.open(path, flags | getattr(os, "O_NONBLOCK", 0))


def _text(plan: CsvPlan, body: bytes) -> str:
    try:
        codec = codecs.lookup(plan.encoding).name
        return body.decode("utf-8-sig" if codec == "utf-8" else codec)
    except LookupError:
        why = f'there is no encoding "{plan.encoding}".'
    except UnicodeError:
        why = f"it is not encoded in {plan.encoding}; say which encoding it has."
    raise _unreadable(plan, why)


def _understood(plan: CsvPlan, text: str) -> Iterator[Row | KeptOut]:
    rules = RowRules(plan.zone, secrets_of(plan.place) if isinstance(plan.place, WebPlace) else ())
    lines = _lines(plan, text)
    header = [name.strip() for name in next(lines, [])]
    if not any(header):
        raise _unreadable(plan, "it has no header line with the names of the columns.")
    columns = columns_of(plan.name, plan.fields, header)
    for number, cells in enumerate(lines, start=1):
        if number > plan.bounds.most_rows:
            raise _unreadable(plan, f"it has more than the {plan.bounds.most_rows} rows that are allowed.")
        if len(cells) == len(header):
            yield understand({name: cells[place] for name, place in columns}, number, rules)
        else:
            why = f"a row must have {len(header)} cells, as the header line has; got {len(cells)}."
            yield keep_out({"cells": plan.delimiter.join(cells)}, number, why, rules)


def _lines(plan: CsvPlan, text: str) -> Iterator[list[str]]:
    """Lines with something on them."""
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=plan.delimiter, strict=True)
    try:
        for cells in reader:
            if cells:
                yield cells
    except csv.Error as error:
        why = f"it is no CSV of RFC 4180 at line {reader.line_num}: {error}."
    else:
        return
    raise _unreadable(plan, why)


def _unreadable(plan: CsvPlan, why: str) -> SourceUnreadable:
    return SourceUnreadable(plan.name, why)
