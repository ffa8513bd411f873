"""How each stream stands, from the tables and the settings."""

import datetime
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from sqlalchemy import Connection

from config.settings import Settings
from config.sources import Source
from config.streams import stream_settings
from service.standing import Bearings, Standing, standing
from storage.posteriors import StoredPosterior, history, newest_posteriors
from storage.rounds import Round, last_good_rounds
from storage.shifts import EMERGING, list_shifts
from storage.streams import Stream


@dataclass(frozen=True, slots=True)
class StreamStanding:
    """A stream with what was last said of it; `stands` is None if the settings no longer describe it."""

    stream: Stream
    newest: StoredPosterior | None
    stands: Standing | None


def standings_of(
    conn: Connection, settings: Settings, streams: Sequence[Stream], now: datetime.datetime
) -> tuple[StreamStanding, ...]:
    """How these streams stand now."""
    newest, rounds = newest_posteriors(conn), last_good_rounds(conn)
    sources = {source.name: source for source in settings.sources}
    return tuple(
        StreamStanding(
            stream,
            newest.get(stream.id),
            _stands(_bearings(conn, settings, sources, stream, newest.get(stream.id), rounds), now),
        )
        for stream in streams
    )


def _stands(bearings: Bearings | None, now: datetime.datetime) -> Standing | None:
    return None if bearings is None else standing(bearings, now)


def _bearings(
    conn: Connection,
    settings: Settings,
    sources: Mapping[str, Source],
    stream: Stream,
    newest: StoredPosterior | None,
    rounds: Mapping[str, Round],
) -> Bearings | None:
    source = sources.get(stream.source)
    described = None if source is None else stream_settings(settings, source, stream.split)
    if source is None or described is None:
        return None
    good = rounds.get(stream.source)
    window = described.judgement.window
    return Bearings(
        last_good_utc=None if good is None else good.started_utc,
        every=source.every,
        counted=0 if newest is None else newest.counted,
        fewest_counts=described.judgement.fewest_counts,
        window=window,
        counts_since=_counts_since(conn, stream, window),
    )


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
