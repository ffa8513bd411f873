"""The stored history of a stream as people read it."""

from collections.abc import Sequence

from service.cli.show import blocks, say, show_table, width
from service.cli.sparkline import sparkline
from service.cli.stream_view import HISTORY_COLUMNS, history_cells
from storage.posteriors import StoredPosterior
from storage.streams import Stream


def show_history(stream: Stream, stored: Sequence[StoredPosterior]) -> None:
    """Print it: the counts at a glance, then count by count."""
    say(f"{stream.title} ({stream.id})")
    if not stored:
        say("Nothing has been said of it yet: no count is stored, or none of that time.")
        return
    say(sparkline([one.count for one in stored], width(), blocks()))
    say("")
    show_table(HISTORY_COLUMNS, [history_cells(one) for one in stored])
