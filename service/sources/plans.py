"""What a source reader needs to know, as the wiring fills it from the settings."""

import hashlib
from dataclasses import dataclass, field
from pathlib import Path
from zoneinfo import ZoneInfo

# Raise it when the same bytes are understood otherwise than before, so that none is passed over as unchanged.
READING_VERSION = 1

Headers = tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class FieldPlan:
    """Where the fields of a row stand: JSONPaths from the row (`$` is the row), or column names."""

    at: str
    count: str
    split: str | None = None
    release: str | None = None
    title: str | None = None
    exposure: str | None = None

    def named(self) -> tuple[tuple[str, str], ...]:
        """The fields that were asked for, each with its place."""
        every = (
            ("at", self.at),
            ("count", self.count),
            ("split", self.split),
            ("release", self.release),
            ("title", self.title),
            ("exposure", self.exposure),
        )
        return tuple((name, place) for name, place in every if place is not None)


@dataclass(frozen=True, slots=True)
class Bounds:
    """Where reading one document ends, whatever the other side does."""

    deadline_seconds: float = 60.0
    largest_body: int = 25_000_000
    most_pages: int = 100
    most_rows: int = 500_000


@dataclass(frozen=True, slots=True)
class WebPlace:
    """An http or https address; it and every header value may be secret and are never shown."""

    address: str = field(repr=False)
    headers: Headers = field(default=(), repr=False)
    address_is_secret: bool = True


@dataclass(frozen=True, slots=True)
class FilePlace:
    """A file of this machine. Its path is no secret."""

    path: Path


@dataclass(frozen=True, slots=True)
class LinkHeader:
    """The next page is named by the Link header of RFC 8288 with rel="next"."""


@dataclass(frozen=True, slots=True)
class NextAddress:
    """The next page's address stands in the page itself, at a JSONPath; null or absent ends."""

    path: str


@dataclass(frozen=True, slots=True)
class JsonPlan:
    """Rows of a JSON document over HTTP."""

    name: str
    place: WebPlace
    rows: str
    fields: FieldPlan
    zone: ZoneInfo
    paging: LinkHeader | NextAddress | None = None
    bounds: Bounds = Bounds()


@dataclass(frozen=True, slots=True)
class CsvPlan:
    """Rows of a CSV table with a header line, from a file or an address."""

    name: str
    place: FilePlace | WebPlace
    fields: FieldPlan
    zone: ZoneInfo
    delimiter: str = ","
    encoding: str = "utf-8"
    bounds: Bounds = Bounds()


@dataclass(frozen=True, slots=True)
class SqlPlan:
    """Rows of one query. The address is always taken for a secret."""

    name: str
    address: str = field(repr=False)
    query: str
    fields: FieldPlan
    zone: ZoneInfo
    bounds: Bounds = Bounds()


SourcePlan = JsonPlan | CsvPlan | SqlPlan


def fingerprint(plan: SourcePlan) -> str:
    """Changes when the same bytes would be understood otherwise or come from elsewhere.

    Validators are good only under the fingerprint they were given with: else a corrected path would meet a
    304 and never be tried. Eight digits, so that the digest of a secret address says nothing about it.
    """
    where = plan.address if isinstance(plan, SqlPlan) else _address(plan.place)
    return hashlib.sha256(
        f"{READING_VERSION}\n{plan!r}\n{where}".encode("utf-8", "surrogatepass")
    ).hexdigest()[:8]


def _address(place: FilePlace | WebPlace) -> str:
    return place.address if isinstance(place, WebPlace) else str(place.path)
