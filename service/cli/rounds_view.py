"""Rounds as people read them."""

from collections.abc import Sequence

from service.cli.show import say, show_table, show_telling
from service.cli.work_view import KEPT_OUT_COLUMNS, ROUND_COLUMNS, ROUND_MAY_LACK, round_cells
from storage.rounds import Round

MOST_NAMED = 10


def show_rounds(rounds: Sequence[Round]) -> None:
    """A table of rounds, and below it what they said."""
    show_telling(ROUND_COLUMNS, [round_cells(one) for one in rounds], ROUND_MAY_LACK)
    for message in dict.fromkeys(one.message for one in rounds if one.message):
        say(f"{_named([one.id for one in rounds if one.message == message])}: {message}")


def show_round(one: Round) -> None:
    """One round with its rows kept out."""
    show_rounds([one])
    say(f"{one.rows_used} rows were used, {one.held} held back{_took(one)}.")
    if one.kept_out:
        say("")
        show_table(KEPT_OUT_COLUMNS, [[row.row, row.why, row.text] for row in one.kept_out])
    beyond = one.kept_out_count - len(one.kept_out)
    if beyond > 0:
        say(f"... and {beyond} more, which were counted but not stored.")


def show_polled(rounds: Sequence[Round]) -> None:
    """The rounds just made, and where to read more of what they kept out."""
    show_rounds(rounds)
    for one in rounds:
        if one.kept_out_count:
            say(f"Which rows were kept out, and why: knickpoint rounds {one.id}")


def _named(numbers: Sequence[int]) -> str:
    if len(numbers) == 1:
        return f"Round {numbers[0]}"
    more = f" and {len(numbers) - MOST_NAMED} more" if len(numbers) > MOST_NAMED else ""
    return f"Rounds {', '.join(map(str, numbers[:MOST_NAMED]))}{more}"


def _took(one: Round) -> str:
    if one.ended_utc is None:
        return ""
    return f"; it took {(one.ended_utc - one.started_utc).total_seconds():.1f} s"
