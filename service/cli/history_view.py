"""The stored history of a stream as people and machines read it."""

from collections.abc import Mapping, Sequence

from service.cli.figures import (
    LEVEL_COLUMN,
    figures_json,
    probability_text,
    quantiles_text,
    run_lengths_json,
    weighted_json,
)
from service.cli.run_start import run_start, run_start_text
from service.cli.show import Cell, blocks, say, show_table, width
from service.cli.sparkline import sparkline
from storage.posteriors import StoredPosterior, as_posterior
from storage.streams import Stream

COLUMNS = ("at", "count", LEVEL_COLUMN, "shift", "run", "run began", "one-off")
EVIDENCE_COLUMNS = ("place", *COLUMNS, "written", "replaced")
LEGEND = (
    "level: as filtered from the counts so far; shift: probability of a recent shift not announced yet; "
    "run: most probable run length, in counts; one-off: probability that the count is one. The whole "
    "run-length posterior is in --json."
)


def show_history(stream: Stream, stored: Sequence[StoredPosterior], labels: Mapping[int, str]) -> None:
    """Print it: the counts at a glance, then count by count."""
    _say_head(stream)
    if not stored:
        say("Nothing has been said of it: no count was folded, or none of that time.")
        return
    say(sparkline([one.count for one in stored], width(), blocks()))
    say(LEGEND)
    say("")
    show_table(COLUMNS, [_cells(one, labels) for one in stored])


def show_evidence(stream: Stream, stored: Sequence[StoredPosterior], labels: Mapping[int, str]) -> None:
    """Print all that was ever said of these places, each place with what holds now first."""
    _say_head(stream)
    if not stored:
        say("Nothing was ever said of that.")
        return
    say(LEGEND)
    say("")
    lines = [[one.place, *_cells(one, labels), one.written_utc, one.superseded_utc] for one in stored]
    show_table(EVIDENCE_COLUMNS, lines)


def history_json(stored: StoredPosterior) -> dict[str, object]:
    """One stored posterior with the whole run-length posterior of its observation."""
    full = as_posterior(stored)
    return {
        **figures_json(stored),
        "run_lengths": run_lengths_json(full.run_lengths),
        "dispersion": weighted_json(full.dispersion),
        "wander": weighted_json(full.wander),
        "written": stored.written_utc,
        "replaced": stored.superseded_utc,
        "fingerprint": stored.fingerprint,
    }


def _say_head(stream: Stream) -> None:
    say(stream.id if stream.title == stream.id else f"{stream.title} ({stream.id})")


def _cells(stored: StoredPosterior, labels: Mapping[int, str]) -> list[Cell]:
    return [
        labels.get(stored.counted, stored.key),
        stored.count,
        quantiles_text(stored.level),
        probability_text(stored.recent_shift),
        stored.run_length_mode,
        run_start_text(run_start(as_posterior(stored)), labels),
        probability_text(stored.one_off),
    ]
