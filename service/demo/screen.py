"""What the demo writes on the screen: calm lines, each with the date on the fast clock."""

import datetime
import os
import sys
import textwrap
from collections.abc import Iterable

import click

WIDEST = 100
NARROWEST = 40
DATE_WIDTH = len("2026-03-02  ")


def say(text: str = "") -> None:
    """A paragraph."""
    _put("\n".join(_wrapped(text, _width())))


def say_as_it_is(text: str) -> None:
    """Lines that may be copied, so they are neither wrapped nor styled."""
    _put(textwrap.indent(text.rstrip("\n"), "    "))


def heading(text: str) -> None:
    """The first line of a part."""
    _put("")
    _put(click.style(text, bold=True))


def tell(date: datetime.date, text: str) -> None:
    """What happened on a date of the fast clock."""
    lines = _wrapped(text, _width() - DATE_WIDTH)
    _put(f"{click.style(date.isoformat(), dim=True)}  {lines[0]}")
    for line in lines[1:]:
        _put(" " * DATE_WIDTH + line)


def quote(text: str) -> None:
    """What somebody else said, under what was told last."""
    for line in _wrapped(text, _width() - DATE_WIDTH - 2):
        _put(" " * DATE_WIDTH + "  " + click.style(line, bold=True))


def commands(pairs: Iterable[tuple[str, str]]) -> None:
    """What each command is for, and under it the command, which is not wrapped so that it can be copied."""
    for purpose, command in pairs:
        _put(f"  {purpose}:")
        _put(f"      {click.style(command, bold=True)}")


def _wrapped(text: str, width: int) -> list[str]:
    # Paths and dates stay whole.
    return textwrap.wrap(text, width, break_long_words=False, break_on_hyphens=False)


def _put(text: str) -> None:
    encoding = sys.stdout.encoding or "utf-8"
    click.echo(text.encode(encoding, "replace").decode(encoding))


def _width() -> int:
    try:
        columns = os.get_terminal_size(sys.stdout.fileno()).columns
    except (OSError, ValueError):
        columns = WIDEST
    # Some terminals do not know their size, and say 0.
    return min(columns, WIDEST) if columns >= NARROWEST else WIDEST
