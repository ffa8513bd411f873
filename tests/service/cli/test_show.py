"""Tables for people, when what they are shown on is not a terminal."""

import datetime
import sys

import pytest

from service.cli.show import (
    LONGEST_WHOLE,
    cell_text,
    fitted,
    number_text,
    plain_lines,
    say,
    show_table,
    show_telling,
)


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0.000"),
        (0.12345, "0.123"),
        (1.5, "1.5"),
        (12.3456, "12.35"),
        (999.94, "999.9"),
        (999.96, "1,000"),
        (1e6, "1,000,000"),
        (-3.14159, "-3.142"),
        (-2500.0, "-2,500"),
    ],
)
def test_figures_have_four_digits(value: float, text: str) -> None:
    assert number_text(value) == text


def test_cells() -> None:
    at = datetime.datetime(2026, 3, 2, 14, 0, 5, 999, tzinfo=datetime.UTC)
    assert [cell_text(cell) for cell in (None, True, 3, "x", at, at.date())] == [
        "-",
        "yes",
        "3",
        "x",
        "2026-03-02T14:00:05Z",
        "2026-03-02",
    ]


def test_columns_are_aligned_and_numbers_stand_to_the_right() -> None:
    lines = list(plain_lines(("name", "count"), [["a", "5"], ["bcdef", "12345"]], [False, True]))
    assert lines == ["name   count", "a          5", "bcdef  12345"]


def test_a_table_that_is_piped_is_plain_and_whole(capsys: pytest.CaptureFixture[str]) -> None:
    title = "x" * 300
    show_table(("title", "count"), [[title, 1], ["[bold]not markup[/bold]", None]])
    out = capsys.readouterr().out
    assert title in out
    assert "[bold]not markup[/bold]" in out
    assert "\x1b" not in out


def test_an_empty_table_still_has_its_headings(capsys: pytest.CaptureFixture[str]) -> None:
    show_table(("title", "count"), [])
    assert capsys.readouterr().out == "title  count\n"


def test_a_column_that_tells_nothing_can_be_left_out(capsys: pytest.CaptureFixture[str]) -> None:
    show_telling(("a", "b", "c"), [[1, None, 0], [None, None, 0]], frozenset({"a", "b"}))
    assert capsys.readouterr().out == "a  c\n1  0\n-  0\n"


@pytest.mark.parametrize(
    ("room", "widths"),
    [
        (60, [10, 20, 30]),
        (50, [10, 18, 22]),
        (30, [10, 8, 12]),
        (24, [10, 5, 9]),
        (23, [10, 20, LONGEST_WHOLE]),
    ],
)
def test_what_can_spare_most_gives_way_first(room: int, widths: list[int]) -> None:
    assert fitted([10, 20, 30], [10, 5, 9], room) == widths


def _pretend_terminal(monkeypatch: pytest.MonkeyPatch) -> None:
    """Standard output says that it is a terminal (whose size nobody knows, so 100 columns)."""
    monkeypatch.setenv("TERM", "xterm")
    for name in ("NO_COLOR", "COLUMNS"):
        monkeypatch.delenv(name, raising=False)
    monkeypatch.setattr(sys.stdout, "isatty", lambda: True)


def test_on_a_terminal_figures_are_never_broken_however_narrow_it_is(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    _pretend_terminal(monkeypatch)
    row = [f"{1000 + place} (900 to 1,234,567)" for place in range(8)]
    show_table([f"level {place}" for place in range(8)], [row])
    lines = capsys.readouterr().out.splitlines()
    assert all(len(line) <= 100 for line in lines[2:])
    assert sorted(" ".join(lines[1:]).split()) == sorted(" ".join(row).split()), "a figure was broken"
    assert "\x1b[1mlevel" in lines[0]


def test_on_a_terminal_long_texts_are_folded_and_nothing_of_them_is_lost(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    _pretend_terminal(monkeypatch)
    show_table(("row", "why"), [[1, "abcdefghij " * 30], [2, "[red]x[/red]"]])
    out = capsys.readouterr().out
    assert out.count("abcdefghij") == 30
    assert "[red]x[/red]" in out
    assert all(len(line) <= 100 for line in out.splitlines()[1:])


def test_on_a_terminal_prose_is_wrapped_between_words(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    _pretend_terminal(monkeypatch)
    say("word " * 50)
    lines = capsys.readouterr().out.splitlines()
    assert len(lines) == 3
    assert set(" ".join(lines).split()) == {"word"}


def test_what_cannot_be_printed_is_replaced(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("service.cli.show.sys", _Ascii())
    say("caf\u00e9 \u2588")
    assert capsys.readouterr().out == "caf? ?\n"


class _Ascii:
    class stdout:  # noqa: N801 - stands for sys.stdout
        encoding = "ascii"

        @staticmethod
        def isatty() -> bool:
            return False
