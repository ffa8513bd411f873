"""The invented house's counting service: one JSON document for all shows, with an ETag."""

import hashlib
import json
from collections.abc import Iterator
from contextlib import contextmanager
from functools import lru_cache
from http import HTTPStatus

from service.clock import Clock
from service.demo.loopback import Handler, serving
from service.demo.story import HOUSE, SHOWS, UNIT, Almanac, count_of

PATH = "/counts"


@contextmanager
def counting_service(clock: Clock, almanac: Almanac) -> Iterator[str]:
    """Serve the counts of all days that are over by the clock; gives the document's address."""

    class Counting(Handler):
        def do_GET(self) -> None:  # noqa: N802  The name is given by http.server.
            if self.path != PATH:
                self.answer(HTTPStatus.NOT_FOUND)
                return
            body, etag = _tagged(almanac, almanac.days_over(clock.now()))
            if self.headers.get("If-None-Match") == etag:
                self.answer(HTTPStatus.NOT_MODIFIED, etag=etag)
            else:
                self.answer(HTTPStatus.OK, body, etag=etag)

    with serving(Counting) as address:
        yield address + PATH


def document(almanac: Almanac, days: int) -> dict[str, object]:
    """What the service says when so many days are over."""
    rows = [
        {"day": almanac.date(day).isoformat(), "show": show.name, UNIT: _count(number, day)}
        for day in range(days)
        for number, show in enumerate(SHOWS)
    ]
    return {"house": HOUSE, "note": "Invented, every count of it.", "counts": rows}


@lru_cache(maxsize=4)
def _tagged(almanac: Almanac, days: int) -> tuple[bytes, str]:
    body = json.dumps(document(almanac, days)).encode()
    return body, f'"{hashlib.sha256(body).hexdigest()[:16]}"'


@lru_cache(maxsize=20_000)
def _count(number: int, day: int) -> int:
    return count_of(SHOWS[number], day)
