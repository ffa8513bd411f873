"""Tables for people, when what they are shown on is not a terminal."""

import datetime

import pytest

from service.cli.show import cell_text, number_text, plain_lines, show_table


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0.000"),
        (0.12345, "0.123"),
        (1.5, "1.5"),
        (12.3456, "12.35"),
        (999.94, "999.9"),
        (999.96, "1 000"),
        (1e6, "1 000 000"),
        (-3.14159, "-3.142"),
        (-2500.0, "-2 500"),
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
