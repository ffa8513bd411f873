"""How each stream stands, from the tables and the settings."""

import datetime
from collections.abc import Sequence
from dataclasses import dataclass, replace

from sqlalchemy import Connection

from config.settings import Settings
from config.streams import stream_settings
from service.standing import Bearings, Standing, standing
from storage.posteriors import StoredPosterior, history, newest_posteriors
from storage.rounds import last_good_rounds
from storage.shifts import EMERGING, list_shifts
from storage.streams import Stream


@dataclass(frozen=True, slots=True)
class StreamStanding:
    """A stream with what was last said of it, and when its source was last reached.

    `stands` is None if the settings no longer describe the stream.
    """

    stream: Stream
    newest: StoredPosterior | None
    last_good_utc: datetime.datetime | None
    stands: Standing | None


def standings_of(
    conn: Connection, settings: Settings, streams: Sequence[Stream], now: datetime.datetime
) -> tuple[StreamStanding, ...]:
    """How these streams stand now."""
    newest, rounds = newest_posteriors(conn), last_good_rounds(conn)
    reached = {source: one.started_utc for source, one in rounds.items()}
    unsaid = (
        StreamStanding(stream, newest.get(stream.id), reached.get(stream.source), None) for stream in streams
    )
    return tuple(replace(one, stands=_stands(conn, settings, one, now)) for one in unsaid)


def _stands(
    conn: Connection, settings: Settings, one: StreamStanding, now: datetime.datetime
) -> Standing | None:
    source = next((source for source in settings.sources if source.name == one.stream.source), None)
    described = None if source is None else stream_settings(settings, source, one.stream.split)
    if source is None or described is None:
        return None
    judgement = described.judgement
    bearings = Bearings(
        last_good_utc=one.last_good_utc,
        every=source.every,
        counted=0 if one.newest is None else one.newest.counted,
        fewest_counts=judgement.fewest_counts,
        window=judgement.window,
        counts_since=_counts_since(conn, one.stream, judgement.window),
    )
    return standing(bearings, now)


def _counts_since(conn: Connection, stream: Stream, window: int) -> int | None:
    """Counts after the newest announcement, counted up to the window; None if no shift is emerging.

    A shift found in history is as new to the level as one that was told.
    """
    emerging = list_shifts(conn, stream_id=stream.id, state=EMERGING, limit=1000)
    if not emerging:
        return None
    newest = max(emerging, key=lambda shift: shift.announced_position)
    later = history(conn, stream.id, since=newest.announced_at, limit=window + 1)
    return sum(stored.position > newest.announced_position for stored in later)
