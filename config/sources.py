"""Sources: where counts are read, and which streams come of them."""

from typing import Annotated, Literal

from pydantic import Field

from config.base import Block
from config.judging import JudgementChanges, ModelChanges
from config.places import (
    DatabaseAddress,
    FieldPath,
    HeaderValue,
    NextPage,
    RowsPath,
    Template,
    WebAddress,
)
from config.values import (
    Bytes,
    CalendarInterval,
    Column,
    Day,
    Deadline,
    Delimiter,
    Encoding,
    Every,
    Name,
    Pages,
    PathHere,
    Query,
    Rows,
    Title,
    Values,
    Wait,
    Zone,
)


class JsonFields(Block):
    """Where the fields of a row stand: JSONPaths in which `$` is the row."""

    at: FieldPath
    count: FieldPath
    split: FieldPath | None = None
    release: FieldPath | None = None
    title: FieldPath | None = None
    exposure: FieldPath | None = None


class ColumnFields(Block):
    """Which columns hold the fields of a row."""

    at: Column
    count: Column
    split: Column | None = None
    release: Column | None = None
    title: Column | None = None
    exposure: Column | None = None


class _Streams(Block):
    slate: Title | None = None
    id: Template | None = None
    title: Template | None = None
    zone: Zone | None = None
    judgement: JudgementChanges = Field(default_factory=JudgementChanges)
    model: ModelChanges = Field(default_factory=ModelChanges)


class CalendarStreams(_Streams):
    """One count an interval. `settling` is how long after its end an interval's count waits."""

    shape: Literal["calendar"]
    interval: CalendarInterval
    absent: Literal["zero", "missing"]
    anchor: Day | None = None
    settling: Wait = Field(default="0s")  # type: ignore[assignment]


class ReleaseStreams(_Streams):
    """One count a release, taken at the age from which it is final."""

    shape: Literal["release"]
    final: Wait


class StreamChanges(Block):
    """What is otherwise for one stream of a source."""

    title: Title | None = None
    slate: Title | None = None
    judgement: JudgementChanges = Field(default_factory=JudgementChanges)
    model: ModelChanges = Field(default_factory=ModelChanges)


class _Source(Block):
    name: Name
    streams: Annotated[CalendarStreams | ReleaseStreams, Field(discriminator="shape")]
    stream: dict[str, StreamChanges] = Field(default_factory=dict)
    leave_out: Values | None = None
    every: Every = Field(default="1h")  # type: ignore[assignment]
    deadline: Deadline = Field(default="60s")  # type: ignore[assignment]
    most_rows: Rows = 500_000


class JsonSource(_Source):
    """Rows of a JSON document at an http or https address."""

    kind: Literal["json"]
    address: WebAddress
    headers: dict[str, HeaderValue] = Field(default_factory=dict)
    rows: RowsPath
    fields: JsonFields
    next_page: NextPage | None = None
    most_pages: Pages = 100
    largest_body: Bytes = 25_000_000


class CsvSource(_Source):
    """Rows of a table with a header line, in a file or at an address: exactly one of the two is given."""

    kind: Literal["csv"]
    path: PathHere | None = None
    address: WebAddress | None = None
    headers: dict[str, HeaderValue] = Field(default_factory=dict)
    fields: ColumnFields
    delimiter: Delimiter = ","
    encoding: Encoding = "utf-8"
    largest_body: Bytes = 25_000_000


class SqlSource(_Source):
    """Rows of a query, to an SQLite file or to an address: exactly one of the two is given."""

    kind: Literal["sql"]
    path: PathHere | None = None
    address: DatabaseAddress | None = None
    query: Query
    fields: ColumnFields


Source = Annotated[JsonSource | CsvSource | SqlSource, Field(discriminator="kind")]
