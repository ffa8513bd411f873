"""What a source gave, as understood, for people and for machines. Pure but for the printing."""

from service.cli.show import Cell, say, show_table
from service.cli.trying import Tried
from service.round.plans import StreamPlan
from service.sources.document import Row
from storage.readings import NewReading

STREAM_COLUMNS = ("stream", "title", "slate", "counts", "from", "to")
KEPT_OUT_COLUMNS = ("row", "why", "text")
ALWAYS = ("row", "at", "count")
SOMETIMES = ("split", "release", "title", "exposure")


def tried_json(tried: Tried) -> dict[str, object]:
    """All rows, the streams that they belong to, and those kept out."""
    return {
        "source": tried.source,
        "rows": [_row_json(row) for row in tried.rows],
        "streams": [_stream_json(stream, readings) for stream, readings in tried.streams],
        "kept_out": tried.kept_out,
        "left_out": tried.left_out,
    }


def show_tried(tried: Tried, limit: int) -> None:
    """The streams, the first rows, and those kept out with the reason."""
    say(_summary(tried))
    if tried.streams:
        say("")
        show_table(STREAM_COLUMNS, [_stream_cells(stream, readings) for stream, readings in tried.streams])
    if tried.rows:
        there = tuple(name for name in SOMETIMES if any(getattr(row, name) is not None for row in tried.rows))
        say("")
        show_table((*ALWAYS, *there), [_row_cells(row, there) for row in tried.rows[:limit]])
        _say_rest(len(tried.rows) - limit)
    if tried.kept_out:
        say("")
        show_table(KEPT_OUT_COLUMNS, [[one.row, one.why, one.text] for one in tried.kept_out[:limit]])
        _say_rest(len(tried.kept_out) - limit)


def _summary(tried: Tried) -> str:
    left_out = f", {tried.left_out} left out as the settings say" if tried.left_out else ""
    rows = f"{len(tried.rows)} rows understood, {len(tried.kept_out)} kept out{left_out}"
    return f'Source "{tried.source}": {rows}. Nothing was stored.'


def _stream_cells(stream: StreamPlan, readings: tuple[NewReading, ...]) -> list[Cell]:
    ordered = _by_date(readings)
    first, last = (ordered[0].key, ordered[-1].key) if ordered else (None, None)
    return [stream.id, stream.title, stream.slate, len(readings), first, last]


def _stream_json(stream: StreamPlan, readings: tuple[NewReading, ...]) -> dict[str, object]:
    return {
        "id": stream.id,
        "title": stream.title,
        "slate": stream.slate,
        "split": stream.split,
        "readings": [{"key": one.key, "at": one.at, "count": one.count} for one in _by_date(readings)],
    }


def _by_date(readings: tuple[NewReading, ...]) -> list[NewReading]:
    return sorted(readings, key=lambda one: (one.at.isoformat(), one.key))


def _row_json(row: Row) -> dict[str, object]:
    values = {name: getattr(row, name) for name in ("count", *SOMETIMES)}
    return {"row": row.number, "at": row.at.isoformat(), **values}


def _row_cells(row: Row, there: tuple[str, ...]) -> list[Cell]:
    return [row.number, row.at.isoformat(), row.count, *(getattr(row, name) for name in there)]


def _say_rest(number: int) -> None:
    if number > 0:
        say(f"... and {number} more (--limit shows more, --json all).")
