"""Writes what a fold led to, in one short transaction that first checks that the stream has not moved on."""

import datetime
from collections.abc import Sequence
from dataclasses import dataclass

from sqlalchemy import Connection

from service.round.advance import Folded
from service.round.observe import Observed
from storage.checkpoints import keep_checkpoint
from storage.posteriors import NewPosterior, supersede_from, write_posteriors
from storage.readings import Head, require_head
from storage.shifts import Shift, overlapping_shifts, record_shift
from storage.streams import set_fingerprint


@dataclass(frozen=True, slots=True)
class Result:
    """A finished fold of one stream, ready to be written."""

    stream_id: str
    head: Head
    fingerprint: str
    observed: Observed
    folded: Folded
    shifts: Sequence[Shift]


def record(conn: Connection, result: Result, now: datetime.datetime) -> tuple[Shift, ...]:
    """Write posteriors, checkpoints and new shifts; gives the shifts that were not there yet.

    Raises
    ------
    storage.errors.HeadMoved
        If readings or settings came in meanwhile; nothing is written, and the fold must be done again.
    """
    require_head(conn, result.stream_id, result.head)
    supersede_from(conn, result.stream_id, result.folded.begun, now=now)
    write_posteriors(conn, result.stream_id, _posteriors(result), now=now)
    resumed = result.folded.begun
    for saved in result.folded.saved:
        keep_checkpoint(
            conn,
            result.stream_id,
            folded=saved.folded,
            resumed_from=resumed,
            digest=result.observed.digests[saved.folded],
            fingerprint=result.fingerprint,
            body=saved.body,
            now=now,
        )
        resumed = saved.folded
    set_fingerprint(conn, result.stream_id, result.fingerprint)
    return tuple(shift for shift in result.shifts if _is_new(conn, shift) and record_shift(conn, shift))


def _is_new(conn: Connection, shift: Shift) -> bool:
    """A shift found again after a re-fold is the same shift if the date regions overlap."""
    first, last = min(shift.region), max(shift.region)
    return not overlapping_shifts(conn, shift.stream_id, first_position=first, last_position=last)


def _posteriors(result: Result) -> list[NewPosterior]:
    rows = []
    for offset, posterior in enumerate(result.folded.posteriors):
        if posterior is None:
            continue
        place = result.folded.begun + offset
        known, observation = result.observed.places[place], result.observed.observations[place]
        rows.append(
            NewPosterior(
                place=place,
                key=known.key,
                at=known.at,
                count=observation.count,
                posterior=posterior,
                fingerprint=result.fingerprint,
                reading_id=known.reading_id,
            )
        )
    return rows
