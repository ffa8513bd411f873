"""Rebuilding a stream: its posteriors folded again from its readings, from the first on."""

import os
from dataclasses import dataclass
from pathlib import Path

from service.clock import SystemClock
from service.round.again import fold_again
from service.round.plans import RoundPlan, StreamPlan
from service.wiring import wire
from storage.engine import open_existing_store
from storage.migrate import require_current
from storage.streams import Stream, get_stream


@dataclass(frozen=True, slots=True)
class Rebuilt:
    """A rebuilt stream. `folded` is None when the settings no longer describe it, and nothing was done."""

    stream_id: str
    folded: int | None
    new_shifts: int


def rebuild_stream(settings: Path, stream_id: str) -> Rebuilt:
    """Forget a stream's checkpoints and fold it again. What was said before is kept as superseded evidence.

    Shifts that were told stay as they are; one found again is the same shift.
    """
    wired = wire(settings, os.environ)
    with open_existing_store(wired.database) as store:
        require_current(store)
        with store.reading() as conn:
            stream = get_stream(conn, stream_id)
        found = _plan_of(wired.rounds, stream)
        if found is None:
            return Rebuilt(stream_id, None, 0)
        brought = fold_again(store, *found, SystemClock())
    return Rebuilt(stream_id, brought.folded, len(brought.shifts))


def _plan_of(rounds: tuple[RoundPlan, ...], stream: Stream) -> tuple[RoundPlan, StreamPlan] | None:
    for plan in rounds:
        if plan.name == stream.source:
            described = plan.stream_for(stream.split)
            return None if described is None else (plan, described)
    return None
