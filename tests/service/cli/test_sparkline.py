"""A series as a line of blocks."""

from hypothesis import given
from hypothesis import strategies as st

from service.cli.sparkline import BLOCKS, sparkline

COUNTS = st.lists(st.none() | st.integers(0, 2**53), max_size=300)


def test_lowest_and_highest() -> None:
    assert sparkline([0, 1, 2, 3, 4, 5, 6, 7], 80)[0] == "▁"
    assert sparkline([0, 1, 2, 3, 4, 5, 6, 7], 80)[-1] == "█"


def test_a_missing_count_is_a_space() -> None:
    assert sparkline([5, None, 5], 80) == "▁ ▁"
    assert sparkline([None, None], 80) == "  "
    assert sparkline([], 80) == ""


def test_one_runaway_hit_does_not_flatten_the_rest() -> None:
    calm = [10, 20] * 20
    line = sparkline([*calm, 1_000_000], 80)
    assert set(line[:-1]) == {"▁", "█"}


def test_neighbours_are_averaged_where_there_are_too_many() -> None:
    line = sparkline([0] * 50 + [8] * 50, 10)
    assert line == "▁" * 5 + "█" * 5


@given(COUNTS, st.integers(1, 200))
def test_it_never_gets_wider_than_asked_and_uses_only_its_blocks(
    counts: list[int | None], width: int
) -> None:
    line = sparkline(counts, width)
    assert len(line) == min(len(counts), width)
    assert set(line) <= {*BLOCKS, " "}


@given(COUNTS)
def test_spaces_are_where_counts_are_missing(counts: list[int | None]) -> None:
    line = sparkline(counts, len(counts) or 1)
    assert [character == " " for character in line] == [count is None for count in counts]
