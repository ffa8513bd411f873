"""Writes what a fold led to, in one short transaction that first checks that the stream has not moved on."""

import datetime
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from sqlalchemy import Connection

from service.round.advance import Folded
from service.round.observe import Observed
from storage.checkpoints import CheckpointMark, keep_checkpoint, list_checkpoints
from storage.posteriors import NewPosterior, supersede_from, write_posteriors
from storage.readings import Head, require_head
from storage.shifts import Shift, list_shifts, record_shift
from storage.streams import bump_epoch, get_stream, set_fingerprint

MOST_SHIFTS = 10_000
"""More than a stream can have: so many are looked through for one that is found again."""


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

    A result that somebody else has recorded meanwhile changes nothing.

    Raises
    ------
    storage.errors.HeadMoved
        If readings or settings came in meanwhile; nothing is written, and the fold must be done again.
    """
    require_head(conn, result.stream_id, result.head)
    before = get_stream(conn, result.stream_id).fingerprint
    marks = list_checkpoints(conn, result.stream_id, fingerprint=result.fingerprint)
    if before == result.fingerprint and is_recorded(marks, result.observed):
        return ()
    supersede_from(conn, result.stream_id, result.folded.begun, now=now)
    write_posteriors(conn, result.stream_id, _posteriors(result), now=now)
    _keep_checkpoints(conn, result, now)
    set_fingerprint(conn, result.stream_id, result.fingerprint)
    if before not in (None, result.fingerprint):
        # Whoever is folding under the settings before these must begin again, or the two would mix.
        bump_epoch(conn, result.stream_id)
    return _record_shifts(conn, result)


def is_recorded(marks: Sequence[CheckpointMark], observed: Observed) -> bool:
    """Whether the checkpoint furthest on, of `marks` furthest on first, is of all these observations."""
    done = len(observed.observations)
    return bool(marks) and marks[0].folded == done and marks[0].digest == observed.digests[done]


def _keep_checkpoints(conn: Connection, result: Result, now: datetime.datetime) -> None:
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


def _record_shifts(conn: Connection, result: Result) -> tuple[Shift, ...]:
    """Add those that are new: a shift found again after a re-fold is the same if the date regions overlap."""
    if not result.shifts:
        return ()
    place_of = {place.key: number for number, place in enumerate(result.observed.places)}
    stored = list_shifts(conn, stream_id=result.stream_id, limit=MOST_SHIFTS)
    known = [_span(shift, place_of) for shift in stored]
    return tuple(
        shift
        for shift in result.shifts
        if not any(_overlap(_span(shift, place_of), span) for span in known) and record_shift(conn, shift)
    )


def _span(shift: Shift, place_of: Mapping[str, int]) -> range:
    """The places of a shift's date region. By key: a release that is put in later moves all positions on."""
    listed = [one.get("key") for one in shift.figures.get("region", ())]
    places = [place_of[key] for key in (shift.start_key, *listed) if key in place_of]
    return range(min(places), max(places) + 1) if places else range(0)


def _overlap(one: range, other: range) -> bool:
    return max(one.start, other.start) < min(one.stop, other.stop)


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
