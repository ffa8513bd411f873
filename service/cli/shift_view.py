"""Shifts as people and machines read them."""

from collections.abc import Mapping, Sequence

from service.cli.figures import place_text, probability_text, quantiles_json
from service.cli.show import Cell, say, show_table
from service.tell.gather import Untold, story_of
from service.tell.words import sentence
from storage.shifts import HISTORY, Shift
from storage.streams import Stream

COLUMNS = ("stream", "since", "noticed at", "shift", "state", "told")
FOUND_IN_HISTORY = "found in history"
MOST_SENTENCES = 10
LEGEND = (
    "since: the most probable first count at the new level; shift: probability of a recent shift when it was "
    "noticed. A date in common is not a cause."
)


def show_shifts(shifts: Sequence[Shift], streams: Mapping[str, Stream]) -> None:
    """A table, and each shift in the words of its alert."""
    if not shifts:
        say("No shift has been announced.")
        return
    show_table(COLUMNS, [_cells(shift, streams[shift.stream_id].shape) for shift in shifts])
    say("")
    for shift in shifts[:MOST_SENTENCES]:
        say(sentence(story_of(Untold(shift, streams[shift.stream_id]))))
    if len(shifts) > MOST_SENTENCES:
        say(f"... and {len(shifts) - MOST_SENTENCES} more, whose levels are in --json.")
    say("")
    say(LEGEND)


def told_text(shift: Shift) -> str:
    """What became of the alert: sent, hushed, no outlet; not yet; or never, since it was found in history."""
    if shift.origin == HISTORY:
        return FOUND_IN_HISTORY
    how = shift.told_how or "not yet"
    return f"{how}, late" if shift.late else how


def shift_json(shift: Shift, streams: Mapping[str, Stream]) -> dict[str, object]:
    """A shift with all its figures; levels are filtered ones."""
    return {
        "id": shift.id,
        "stream": shift.stream_id,
        "title": streams[shift.stream_id].title,
        "origin": FOUND_IN_HISTORY if shift.origin == HISTORY else shift.origin,
        "state": shift.state,
        "start": {"key": shift.start_key, "at": shift.start_at, "position": shift.start_position},
        "announced": {
            "key": shift.announced_key,
            "at": shift.announced_at,
            "position": shift.announced_position,
        },
        "recorded": shift.announced_utc,
        "region": shift.region,
        "probability": shift.probability,
        "level_before": quantiles_json(shift.level_before),
        "level_after": quantiles_json(shift.level_after),
        "late": shift.late,
        "told": shift.told_utc,
        "told_how": shift.told_how,
        "figures": shift.figures,
    }


def _cells(shift: Shift, shape: str) -> list[Cell]:
    return [
        shift.stream_id,
        place_text(shape, shift.start_key, shift.start_at),
        place_text(shape, shift.announced_key, shift.announced_at),
        probability_text(shift.probability),
        shift.state,
        told_text(shift),
    ]
