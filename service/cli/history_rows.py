"""Which rows of a stream's stored history are asked for."""

import datetime
from dataclasses import dataclass

from sqlalchemy import Connection

from service.cli.figures import place_text
from storage.posteriors import StoredPosterior, evidence, history
from storage.streams import Stream

At = datetime.date | datetime.datetime


@dataclass(frozen=True, slots=True)
class Span:
    """From `since` on, before `until`, and of these the newest `limit`."""

    since: At | None
    until: At | None
    limit: int


def current_rows(conn: Connection, stream: Stream, span: Span) -> tuple[StoredPosterior, ...]:
    """What holds now, the newest last."""
    return history(conn, stream.id, since=span.since, until=span.until, limit=span.limit)


def all_rows(conn: Connection, stream: Stream, span: Span) -> tuple[StoredPosterior, ...]:
    """The same with all that was said of these places before, after each what it replaced."""
    places = [one.place for one in current_rows(conn, stream, span)]
    return tuple(row for place in places for row in evidence(conn, stream.id, place))


def labels_for(conn: Connection, stream: Stream, rows: tuple[StoredPosterior, ...]) -> dict[int, str]:
    """What the counts are called to which the longest of these runs reaches back, by their numbers."""
    longest = max((row.run_length_mode for row in rows), default=0)
    if not rows:
        return {}
    last = max(rows, key=lambda row: row.counted)
    # Groups of old runs span an eighth of their age; twice the length reaches beyond any of them.
    span = last.counted - min(row.counted for row in rows) + 2 * longest + 1
    known = history(conn, stream.id, limit=span + _newer(conn, stream, last))
    return {row.counted: place_text(stream.shape, row.key, row.at) for row in known}


def _newer(conn: Connection, stream: Stream, last: StoredPosterior) -> int:
    newest = history(conn, stream.id, limit=1)
    return newest[0].counted - last.counted if newest else 0
