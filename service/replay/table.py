"""The file to be replayed, as understood."""

import csv
import datetime
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from zoneinfo import ZoneInfo

from service.replay.errors import NothingToReplay
from service.sources.csv_table import read_csv
from service.sources.document import KeptOut, Row, Validators
from service.sources.plans import CsvPlan, FieldPlan, FilePlace

At = datetime.date | datetime.datetime
OPTIONAL = ("release", "exposure")
LONGEST_HEADER = 100_000


@dataclass(frozen=True, slots=True)
class Entry:
    """A row that can be used. `index` counts the file's rows of data from 0."""

    index: int
    at: At
    count: int | None
    release: str | None
    exposure: float


@dataclass(frozen=True, slots=True)
class Table:
    """The rows in the file's order, those kept out, and which of the optional columns there are."""

    entries: tuple[Entry, ...]
    kept_out: tuple[KeptOut, ...]
    columns: frozenset[str]

    @property
    def rows(self) -> int:
        """How many rows of data the file has."""
        return len(self.entries) + len(self.kept_out)


def read_table(path: Path, zone: ZoneInfo | None, monotonic: Callable[[], float]) -> Table:
    """Read a file the way a CSV source is read; date-times without a zone are read in `zone`, or UTC.

    Raises
    ------
    SourceUnreadable
        If the file as a whole cannot be read.
    NothingToReplay
        If no row can be used.
    """
    there = frozenset(OPTIONAL) & _header(path)
    fields = FieldPlan(
        "at", "count", release=_if_there("release", there), exposure=_if_there("exposure", there)
    )
    plan = CsvPlan(path.name, FilePlace(path), fields, zone or ZoneInfo("UTC"))
    document = read_csv(plan, Validators(), monotonic)
    if not document.rows:
        raise NothingToReplay(path.name, len(document.kept_out))
    return Table(tuple(map(_entry, document.rows)), document.kept_out, there)


def _entry(row: Row) -> Entry:
    exposure = 1.0 if row.exposure is None else row.exposure
    return Entry(row.number - 1, row.at, row.count, row.release, exposure)


def _if_there(name: str, there: frozenset[str]) -> str | None:
    return name if name in there else None


def _header(path: Path) -> frozenset[str]:
    """The names in the first line; whatever is wrong with the file, the reader proper says."""
    try:
        with path.open(encoding="utf-8-sig", errors="replace", newline="") as file:
            line = file.readline(LONGEST_HEADER)
    except OSError:
        return frozenset()
    return frozenset(name.strip() for name in next(csv.reader([line]), []))
