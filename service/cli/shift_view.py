"""Shifts as people and machines read them."""

from collections.abc import Mapping, Sequence

from service.cli.figures import probability_text, quantiles_json, quantiles_text
from service.cli.show import Cell, say, show_table
from storage.shifts import HISTORY, Shift

COLUMNS = ("stream", "since", "noticed at", "shift", "level before", "level after", "state", "told")
FOUND_IN_HISTORY = "found in history"
CAUTION = (
    "since: the most probable first count at the new level, which may lie somewhat off; shift: probability "
    "of a recent shift when it was noticed; levels: as filtered by then, with their 5 % and 95 % quantiles. "
    "A date in common is not a cause."
)


def show_shifts(shifts: Sequence[Shift]) -> None:
    """A table, and how to read it."""
    if not shifts:
        say("No shift has been announced.")
        return
    show_table(COLUMNS, [_cells(shift) for shift in shifts])
    say("")
    say(CAUTION)


def told_text(shift: Shift) -> str:
    """What became of the alert: sent, hushed, no outlet; not yet; or never, since it was found in history."""
    if shift.origin == HISTORY:
        return FOUND_IN_HISTORY
    how = shift.told_how or "not yet"
    return f"{how}, late" if shift.late else how


def shift_json(shift: Shift, titles: Mapping[str, str]) -> dict[str, object]:
    """A shift with all its figures; levels are filtered ones."""
    return {
        "id": shift.id,
        "stream": shift.stream_id,
        "title": titles.get(shift.stream_id),
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


def _cells(shift: Shift) -> list[Cell]:
    return [
        shift.stream_id,
        shift.start_key,
        shift.announced_key,
        probability_text(shift.probability),
        quantiles_text(shift.level_before),
        quantiles_text(shift.level_after),
        shift.state,
        told_text(shift),
    ]
