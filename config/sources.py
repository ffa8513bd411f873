"""Where counts are read: a JSON address, a CSV table, a query."""

import datetime
from pathlib import Path
from typing import Annotated, Any, Literal

from jsonpath import JSONPath, JSONPathEnvironment, JSONPathError
from pydantic import AfterValidator, BeforeValidator, Discriminator, Field, Tag, ValidationInfo

from config.addresses import DatabaseAddress, Headers, SourceAddress
from config.calendar_words import Zone
from config.durations import Deadline, Every, Size
from config.part import TAG, Part, chosen_by, surroundings, wrong
from config.secret import Secret
from config.streams_part import StreamChanges, Streams
from config.words import LeaveOut, Name, SplitValue

KINDS = ("json", "csv", "sql")
LINK_HEADER = "link header"
_JSON_PATHS = JSONPathEnvironment(strict=True)


def _json_path(text: str) -> str:
    try:
        usable = isinstance(_JSON_PATHS.compile(text), JSONPath)
    except (JSONPathError, RecursionError):
        usable = False
    if not usable:
        raise wrong()
    return text


def _place(raw: Any, info: ValidationInfo) -> Path:
    if isinstance(raw, Path):
        return raw
    if not isinstance(raw, str) or not raw or "\0" in raw or "://" in raw:
        raise wrong()
    return surroundings(info).folder / raw


def _delimiter(text: str) -> str:
    if len(text) != 1 or text in '"\r\n':
        raise wrong()
    return text


def _encoding(text: str) -> str:
    try:
        "".encode(text)
    except (LookupError, ValueError):
        raise wrong() from None
    return text


def _paging(raw: Any) -> Any:
    if isinstance(raw, dict | NextAddress) or raw == LINK_HEADER:
        return raw
    raise wrong(LINK_HEADER if isinstance(raw, str) else None)


def _paging_kind(raw: Any) -> str:
    return f"{TAG}text" if isinstance(raw, str) else f"{TAG}table"


JsonPathText = Annotated[
    str, AfterValidator(_json_path), Field(description='a JSONPath (RFC 9535), such as "$.shows[*]"')
]
Column = Annotated[str, Field(min_length=1, max_length=200, description="a column name in quotes")]
FilePath = Annotated[
    Path, BeforeValidator(_place), Field(description="the path of a file, from the settings file's folder")
]
Most = Annotated[int, Field(ge=1, le=10_000_000, description="a whole number from 1 to 10000000")]


class NextAddress(Part):
    """The next page's address stands in the page, at a JSONPath."""

    next: JsonPathText


Paging = Annotated[
    Annotated[Literal["link header"], Tag(f"{TAG}text")] | Annotated[NextAddress, Tag(f"{TAG}table")],
    Discriminator(_paging_kind),
    BeforeValidator(_paging),
    Field(description='"link header" or { next = "$.next" }'),
]


class JsonFields(Part):
    """Where a row's fields stand: JSONPaths from the row, `$` being the row."""

    at: JsonPathText
    count: JsonPathText
    split: JsonPathText | None = None
    release: JsonPathText | None = None
    title: JsonPathText | None = None
    exposure: JsonPathText | None = None


class ColumnFields(Part):
    """Where a row's fields stand: column names."""

    at: Column
    count: Column
    split: Column | None = None
    release: Column | None = None
    title: Column | None = None
    exposure: Column | None = None


class SourceCommon(Part):
    """What sources of all kinds have. `zone` None means the service's."""

    name: Name
    every: Every = datetime.timedelta(hours=1)
    deadline: Deadline = datetime.timedelta(seconds=60)
    largest_body: Size = 25_000_000
    most_rows: Most = 500_000
    zone: Zone | None = None
    leave_out: LeaveOut = ()
    streams: Streams = Field(description="a table [source.streams]")
    changes: dict[SplitValue, StreamChanges] = Field(
        default={}, alias="stream", description='tables [source.stream."SPLIT VALUE"]'
    )


class JsonSource(SourceCommon):
    """Rows of a JSON document over HTTP."""

    kind: Literal["json"]
    address: SourceAddress
    headers: Headers = Field(default={})
    rows: JsonPathText
    paging: Paging | None = None
    most_pages: Most = 100
    fields: JsonFields = Field(description="a table [source.fields]")


class CsvSource(SourceCommon):
    """Rows of a CSV table with a header line. Exactly one of path and address is there."""

    kind: Literal["csv"]
    path: FilePath | None = None
    address: SourceAddress | None = None
    headers: Headers = Field(default={})
    delimiter: Annotated[str, AfterValidator(_delimiter), Field(description="one character")] = ","
    encoding: Annotated[
        str, AfterValidator(_encoding), Field(description='an encoding that Python knows, such as "utf-8"')
    ] = "utf-8"
    fields: ColumnFields = Field(description="a table [source.fields]")

    @property
    def place(self) -> Path | str | Secret:
        """The file, or the address."""
        place = self.path or self.address
        if place is None:
            raise ValueError("A CSV source needs a path or an address.")
        return place


class SqlSource(SourceCommon):
    """Rows of one query."""

    kind: Literal["sql"]
    address: DatabaseAddress
    query: str = Field(min_length=1, description="one query in quotes")
    fields: ColumnFields = Field(description="a table [source.fields]")


Source = Annotated[
    Annotated[JsonSource, Tag(f"{TAG}json")]
    | Annotated[CsvSource, Tag(f"{TAG}csv")]
    | Annotated[SqlSource, Tag(f"{TAG}sql")],
    chosen_by("kind", KINDS),
]
