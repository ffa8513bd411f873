"""The backlog of a source: streams with readings that are not folded yet, brought up one after another."""

import datetime
import threading
from collections.abc import Iterable
from dataclasses import dataclass
from operator import itemgetter

from sqlalchemy import Connection

from detectors.errors import DetectorError
from service.clock import Clock
from service.logs import log
from service.round.fold import Brought, Timing, bring_up
from service.round.keep import planned_streams
from service.round.keys import began_utc
from service.round.lateness import downtimes
from service.round.observe import UnusableReadings
from service.round.plans import CalendarShape, RoundPlan
from storage.engine import Store
from storage.errors import StoreError
from storage.readings import newest_readings
from storage.rounds import good_rounds
from storage.shifts import Shift

ROUNDS_LOOKED_AT = 50
NEVER = datetime.datetime(1970, 1, 1, tzinfo=datetime.UTC)


@dataclass(frozen=True, slots=True)
class Backlog:
    """What became of a source's streams; `trouble` has a sentence for each that could not be folded."""

    brought: tuple[tuple[str, Brought], ...]
    trouble: tuple[str, ...]


def bring_up_source(store: Store, plan: RoundPlan, clock: Clock, stop: threading.Event) -> Backlog:
    """Fold the backlog of a source's streams, stopping between streams when asked to.

    One that cannot be folded keeps none of the others from being folded and told.
    """
    timing = timing_of(store, plan, clock.now())
    with store.reading() as conn:
        streams = planned_streams(conn, plan)
    brought: list[tuple[str, Brought]] = []
    trouble: list[str] = []
    for stream in streams:
        if stop.is_set():
            left = len(streams) - len(brought) - len(trouble)
            log.info("folding stopped", source=plan.name, done=len(brought), left=left)
            break
        try:
            done = bring_up(store, stream, clock, timing)
        except Exception as error:  # The round goes on; its record and the log say what happened.
            log.exception("stream not folded", stream=stream.id)
            trouble.append(_sentence(stream.id, error))
            continue
        brought.append((stream.id, done))
        _log_shifts(done.shifts)
    return Backlog(tuple(brought), tuple(trouble))


def timing_of(store: Store, plan: RoundPlan, now: datetime.datetime) -> Timing:
    """How far the source's counts reach by now, when it was last read, and when it should have been."""
    with store.reading() as conn:
        reaches = _reaches(conn, plan, now)
        rounds = good_rounds(conn, plan.name, limit=ROUNDS_LOOKED_AT)
    read = rounds[0].started_utc if rounds else NEVER
    return Timing(reaches, downtimes(rounds, plan.every, now), read)


def _reaches(
    conn: Connection, plan: RoundPlan, now: datetime.datetime
) -> datetime.date | datetime.datetime | None:
    """The newest date of any calendar stream that has begun: a row put in ahead proves nothing."""
    begun = (
        (began_utc(stream.shape, one.at), one.at)
        for stream in planned_streams(conn, plan)
        if isinstance(stream.shape, CalendarShape) and stream.shape.absent == "zero"
        for one in newest_readings(conn, stream.id)
    )
    newest = max((pair for pair in begun if pair[0] <= now), default=None, key=itemgetter(0))
    return None if newest is None else newest[1]


def _sentence(stream_id: str, error: Exception) -> str:
    if isinstance(error, UnusableReadings | DetectorError | StoreError):
        return f"Stream {stream_id!r} could not be folded: {error}"
    return f"Stream {stream_id!r} could not be folded: unexpected {type(error).__name__}; the log has more."


def _log_shifts(shifts: Iterable[Shift]) -> None:
    for shift in shifts:
        log.info(
            "shift recorded", stream=shift.stream_id, shift=shift.id, origin=shift.origin, late=shift.late
        )
