"""Rounds as people read them."""

from collections.abc import Sequence

from service.cli.show import say, show_table
from service.cli.work_view import KEPT_OUT_COLUMNS, ROUND_COLUMNS, round_cells
from storage.rounds import Round


def show_rounds(rounds: Sequence[Round]) -> None:
    """A table of rounds, and below it what those that went wrong said."""
    show_table(ROUND_COLUMNS, [round_cells(one) for one in rounds])
    for one in rounds:
        if one.message:
            say(f"Round {one.id}: {one.message}")


def show_round(one: Round) -> None:
    """One round with its rows kept out."""
    show_rounds([one])
    if one.kept_out:
        say("")
        show_table(KEPT_OUT_COLUMNS, [[row.row, row.why, row.text] for row in one.kept_out])
    beyond = one.kept_out_count - len(one.kept_out)
    if beyond > 0:
        say(f"... and {beyond} more, which were counted but not stored.")
