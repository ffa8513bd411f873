"""A source fetched once and sorted as a round would, with nothing stored."""

import datetime
from collections.abc import Callable
from dataclasses import dataclass

from service.round.keys import sort_rows
from service.round.plans import RoundPlan, StreamPlan
from service.sources.document import KeptOut, Row, Validators
from service.sources.open_source import Tools, read_document
from storage.readings import NewReading


@dataclass(frozen=True, slots=True)
class Tried:
    """What a round would make of the source now. `left_out` counts rows that the settings leave out."""

    source: str
    rows: tuple[Row, ...]
    streams: tuple[tuple[StreamPlan, tuple[NewReading, ...]], ...]
    kept_out: tuple[KeptOut, ...]
    left_out: int


def try_source(plan: RoundPlan, monotonic: Callable[[], float], now: datetime.datetime) -> Tried:
    """Read the source and sort its rows.

    Raises
    ------
    SourceUnreadable
        If the document as a whole cannot be read.
    """
    document = read_document(plan.source, Validators(), tools=Tools(monotonic))
    found = sort_rows(document.rows, plan, now)
    kept_out = sorted((*document.kept_out, *found.kept_out), key=lambda one: one.row)
    return Tried(plan.name, document.rows, found.by_stream, tuple(kept_out), found.left_out)
