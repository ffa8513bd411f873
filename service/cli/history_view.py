"""The stored history of a stream as people read it."""

from collections.abc import Sequence

from service.cli.show import blocks, say, show_table, width
from service.cli.sparkline import sparkline
from service.cli.stream_view import HISTORY_COLUMNS, history_cells
from storage.posteriors import StoredPosterior
from storage.streams import Stream

LEGEND = (
    "shift: probability of a recent shift; run: most probable run length, in counts; run lengths: the most "
    "probable groups of them; one-off: probability that the count is one; log p: log probability of the "
    "count, given those before it. With --json the whole run-length posterior of each count."
)


def show_history(stream: Stream, stored: Sequence[StoredPosterior]) -> None:
    """Print it: the counts at a glance, then count by count."""
    say(f"{stream.title} ({stream.id})")
    if not stored:
        say("Nothing has been said of it yet: no count is stored, or none of that time.")
        return
    say(sparkline([one.count for one in stored], width(), blocks()))
    say(LEGEND)
    say("")
    show_table(HISTORY_COLUMNS, [history_cells(one) for one in stored])
