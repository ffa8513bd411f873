"""How results reach a person or a machine: tables, one JSON document, progress on long work."""

import datetime
import os
import sys
import textwrap
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager

import click

from service.cli.json_form import instant_text, json_text
from service.cli.sparkline import BLOCKS, PLAIN_BLOCKS

Cell = str | int | float | bool | datetime.date | None
PLAIN_WIDTH = 100
NARROWEST = 20
GAP = 2
LONGEST_WHOLE = 28


def show_json(value: object) -> None:
    """One JSON document on standard output, which pipes get as UTF-8 whatever the locale says."""
    click.echo(json_text(value).encode())


def show_table(columns: Sequence[str], rows: Sequence[Sequence[Cell]]) -> None:
    """A table: with lines and headings on a terminal, plain aligned columns anywhere else."""
    cells = [[cell_text(cell) for cell in row] for row in rows]
    right = [bool(rows) and all(_is_number(row[place]) for row in rows) for place in range(len(columns))]
    if sys.stdout.isatty():
        _show_rich(columns, cells, right)
    else:
        for line in plain_lines(columns, cells, right):
            say(line)


def show_telling(columns: Sequence[str], rows: Sequence[Sequence[Cell]], may_lack: frozenset[str]) -> None:
    """A table without those of the named columns that are empty, or 0, on every line."""
    there = [
        place for place, name in enumerate(columns) if name not in may_lack or any(row[place] for row in rows)
    ]
    show_table([columns[place] for place in there], [[row[place] for place in there] for row in rows])


def plain_lines(
    columns: Sequence[str], cells: Sequence[Sequence[str]], right: Sequence[bool]
) -> Iterator[str]:
    """The lines of a table without any drawing; nothing is cut off, since a program may read it."""
    every = [list(columns), *cells]
    widths = [max(len(row[place]) for row in every) for place in range(len(columns))]
    for row in every:
        padded = (
            cell.rjust(width) if to_right else cell.ljust(width)
            for cell, width, to_right in zip(row, widths, right, strict=True)
        )
        yield "  ".join(padded).rstrip()


def cell_text(cell: Cell) -> str:
    """A cell as people read it: nothing as a dash, instants in UTC, figures to four digits."""
    match cell:
        case None:
            return "-"
        case bool():
            return "yes" if cell else "no"
        case float():
            return number_text(cell)
        case datetime.datetime():
            return instant_text(cell.replace(microsecond=0))
        case datetime.date():
            return cell.isoformat()
        case _:
            return str(cell)


def number_text(value: float) -> str:
    """A figure to four digits, large ones in full and with commas between thousands, as in alerts."""
    # Figures that rounding lifts to the next thousand belong to it.
    if abs(value) >= 999.95:
        return f"{value:,.0f}"
    return f"{value:.3f}" if abs(value) < 1 else f"{value:.4g}"


def say(text: str) -> None:
    """A line for a person: wrapped on a terminal, and what cannot be printed there is replaced."""
    encoding = sys.stdout.encoding or "utf-8"
    printable = text.encode(encoding, "replace").decode(encoding)
    click.echo(textwrap.fill(printable, width()) if _is_long_prose(printable) else printable)


def note(text: str) -> None:
    """A line beside the result: on standard error."""
    click.echo(f"knickpoint: {text}", err=True)


def blocks() -> str:
    """The blocks for a sparkline that standard output can print."""
    try:
        BLOCKS.encode(sys.stdout.encoding or "utf-8")
    except UnicodeEncodeError:
        return PLAIN_BLOCKS
    return BLOCKS


def width() -> int:
    """How many characters fit on a line."""
    try:
        columns = os.get_terminal_size(sys.stdout.fileno()).columns
    except (OSError, ValueError):
        return PLAIN_WIDTH
    # Some terminals do not know their size, and say 0.
    return columns if columns >= NARROWEST else PLAIN_WIDTH


@contextmanager
def progress(title: str, total: int) -> Iterator[Callable[[int], None]]:
    """A bar on standard error while something long goes on; gives the function that moves it on.

    Only on a terminal: in a log it would be noise.
    """
    if not sys.stderr.isatty():
        yield lambda _steps: None
        return
    from rich.console import Console
    from rich.progress import Progress

    with Progress(console=Console(stderr=True), transient=True) as bar:
        task = bar.add_task(title, total=total)
        yield lambda steps: bar.advance(task, steps)


def _show_rich(columns: Sequence[str], cells: Sequence[Sequence[str]], right: Sequence[bool]) -> None:
    from rich.console import Console
    from rich.table import Table
    from rich.text import Text

    columns_of_cells = list(zip(columns, *cells, strict=True))
    full = [max(map(len, column)) for column in columns_of_cells]
    widths = fitted(full, list(map(_least_width, columns_of_cells)), width() - GAP * len(columns))
    table = Table(box=None, pad_edge=False, padding=(0, GAP, 0, 0))
    for name, to_right, length in zip(columns, right, widths, strict=True):
        table.add_column(name, justify="right" if to_right else "left", overflow="fold", width=length)
    for row in cells:
        # As Text, so that brackets in a title are not taken for markup.
        table.add_row(*map(Text, row))
    # Figures, dates and ids are never broken; on a terminal that is too narrow for them, lines run on.
    Console(width=max(width(), sum(widths) + GAP * len(widths))).print(table)


def fitted(full: Sequence[int], least: Sequence[int], room: int) -> list[int]:
    """Widths that fit into the room, where what can spare most gives way first.

    Where not even the least ones fit, only what is long anyway gives way, and lines run on.
    """
    most = room if sum(least) <= room else LONGEST_WHOLE
    widths = [max(min(length, most), shortest) for length, shortest in zip(full, least, strict=True)]
    if sum(least) > room:
        return widths
    spare = [length - shortest for length, shortest in zip(widths, least, strict=True)]
    for _ in range(min(sum(widths) - room, sum(spare))):
        place = spare.index(max(spare))
        spare[place] -= 1
        widths[place] -= 1
    return widths


def _least_width(column: Sequence[str]) -> int:
    """That of its longest word, unless that is longer than any figure, date or id."""
    words = (word for cell in column for word in cell.split() or [""])
    return min(max(map(len, words)), LONGEST_WHOLE)


def _is_long_prose(text: str) -> bool:
    return sys.stdout.isatty() and len(text) > width() and " " in text


def _is_number(cell: Cell) -> bool:
    return cell is None or (isinstance(cell, int | float) and not isinstance(cell, bool))
