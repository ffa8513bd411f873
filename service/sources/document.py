"""What a source gave, as understood."""

import datetime
from dataclasses import dataclass, field


@dataclass(frozen=True, slots=True)
class Row:
    """One count as a source gave it. `count` None is a missing count; an instant `at` is always aware."""

    split: str | None
    at: datetime.date | datetime.datetime
    count: int | None
    release: str | None = None
    title: str | None = None
    exposure: float | None = None
    number: int = field(default=0, compare=False)


@dataclass(frozen=True, slots=True)
class KeptOut:
    """A row that was not used: its number (the first row of data is 1), why, and its text, cut short.

    `place` is the row without its count, where it can be read whose it is and of when.
    """

    row: int
    why: str
    text: str
    place: Row | None = field(default=None, compare=False, repr=False)


@dataclass(frozen=True, slots=True)
class Validators:
    """By what a source can be asked whether its document is still the one we have."""

    etag: str | None = None
    last_modified: str | None = None
    fingerprint: str | None = None


@dataclass(frozen=True, slots=True)
class Document:
    """A whole document: never a part of one."""

    rows: tuple[Row, ...] = ()
    kept_out: tuple[KeptOut, ...] = ()
    not_modified: bool = False
    validators: Validators = Validators()
