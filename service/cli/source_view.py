"""A source's document as understood, for people and for machines."""

from service.cli.show import Cell, say, show_table
from service.sources.document import Document, Row

KEPT_OUT_COLUMNS = ("row", "why", "text")
ALWAYS = ("row", "at", "count")
SOMETIMES = ("split", "release", "title", "exposure")


def document_json(name: str, document: Document) -> dict[str, object]:
    """All rows, and those kept out."""
    return {"source": name, "rows": document.rows, "kept_out": document.kept_out}


def show_document(name: str, document: Document, limit: int) -> None:
    """The first rows as a table, then those kept out with the reason."""
    used, out = len(document.rows), len(document.kept_out)
    say(f'Source "{name}": {used} rows understood, {out} kept out. Nothing was stored.')
    there = tuple(
        field for field in SOMETIMES if any(getattr(row, field) is not None for row in document.rows)
    )
    show_table((*ALWAYS, *there), [_cells(row, there) for row in document.rows[:limit]])
    _say_rest(used - limit)
    if document.kept_out:
        say("")
        show_table(KEPT_OUT_COLUMNS, [[one.row, one.why, one.text] for one in document.kept_out[:limit]])
        _say_rest(out - limit)


def _cells(row: Row, there: tuple[str, ...]) -> list[Cell]:
    return [row.number, row.at.isoformat(), row.count, *(getattr(row, field) for field in there)]


def _say_rest(number: int) -> None:
    if number > 0:
        say(f"... and {number} more (--limit shows more, --json all).")
