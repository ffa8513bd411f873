"""From stored readings to observations: which count stands where, and which still wait. Pure."""

import datetime
import hashlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from detectors.observation import Observation
from service.round.calendar import at_of, key_of, last_over, position_of
from service.round.keys import came_out_utc, ready_utc
from service.round.plans import CalendarShape, ReleaseShape, StreamPlan
from storage.readings import Reading

At = datetime.date | datetime.datetime

MOST_FILLED = 100_000
"""Most absent intervals that are filled in one stream."""


@dataclass(frozen=True, slots=True)
class Place:
    """What stands at one place of a stream: its key and date, and the reading it rests on (None: absent)."""

    key: str
    at: At
    title: str | None
    reading_id: int | None
    ready_utc: datetime.datetime


@dataclass(frozen=True, slots=True)
class Observed:
    """A stream's observations in order, with the place of each and the digest of each beginning.

    `digests[n]` is the digest of the first n observations, so it has one entry more than there are. `waiting`
    counts the readings that are not yet counted: an open interval, a release younger than its final age.
    """

    observations: tuple[Observation, ...]
    places: tuple[Place, ...]
    digests: tuple[str, ...]
    waiting: int


class TooManyAbsent(ValueError):
    """The dates of a stream lie so far apart that filling what lies between would never end."""

    def __init__(self, stream_id: str, absent: int) -> None:
        super().__init__(
            f"Stream {stream_id!r} has {absent} absent intervals, more than {MOST_FILLED}: its dates or its "
            "interval must be wrong. Correct the source or the setting `interval`."
        )


@dataclass(frozen=True, slots=True)
class Stored:
    """A stream's readings, one a key: the newest, and of releases those that held at the final age."""

    newest: Sequence[Reading]
    ripe: Sequence[Reading] = ()


def observe(
    plan: StreamPlan, stored: Stored, now: datetime.datetime, *, source_reaches: At | None = None
) -> Observed:
    """Turn a stream's readings into observations.

    A calendar count is the newest one read. A release's count is the one that held when it was first read at
    its final age, so that all releases are compared at one age and one that goes on growing slowly stays as
    it was. `source_reaches` is the newest date of the whole source: up to there an absent interval can be
    taken for zero; beyond it the source may just be behind.
    """
    if isinstance(plan.shape, CalendarShape):
        return _calendar(plan, plan.shape, stored.newest, now, source_reaches)
    return _releases(plan.shape, stored, now)


def _calendar(
    plan: StreamPlan,
    shape: CalendarShape,
    readings: Sequence[Reading],
    now: datetime.datetime,
    reaches: At | None,
) -> Observed:
    axis = shape.axis
    by_position = {position_of(axis, reading.at): reading for reading in readings}
    if not by_position:
        return _observed([], [], 0)
    first, newest = min(by_position), max(by_position)
    over = last_over(axis, now - shape.settling)
    end = newest if reaches is None else max(newest, position_of(axis, reaches))
    end = min(end, over) if shape.absent == "zero" else min(newest, over)
    if end - first + 1 - len(by_position) > MOST_FILLED:
        raise TooManyAbsent(plan.id, end - first + 1 - len(by_position))
    observations, places = [], []
    for position in range(first, end + 1):
        reading = by_position.get(position)
        observations.append(_calendar_observation(shape, position, reading))
        places.append(_calendar_place(shape, position, reading))
    return _observed(observations, places, sum(position > over for position in by_position))


def _calendar_observation(shape: CalendarShape, position: int, reading: Reading | None) -> Observation:
    if reading is None:
        return Observation(position, 0 if shape.absent == "zero" else None)
    return Observation(position, reading.count, reading.exposure or 1.0)


def _calendar_place(shape: CalendarShape, position: int, reading: Reading | None) -> Place:
    at = at_of(shape.axis, position)
    key = key_of(shape.axis, position)
    if reading is None:
        return Place(key, at, None, None, ready_utc(shape, at))
    return Place(key, at, reading.title, reading.id, ready_utc(shape, at))


def _releases(shape: ReleaseShape, stored: Stored, now: datetime.datetime) -> Observed:
    ripe = {reading.key: reading for reading in stored.ripe}
    ordered = sorted(stored.newest, key=lambda reading: (came_out_utc(shape, reading.at), reading.key))
    out = [ripe.get(reading.key, reading) for reading in ordered if ready_utc(shape, reading.at) <= now]
    observations = [_release_observation(place, reading, ripe) for place, reading in enumerate(out)]
    places = [
        Place(reading.key, reading.at, reading.title, reading.id, ready_utc(shape, reading.at))
        for reading in out
    ]
    return _observed(observations, places, len(ordered) - len(out))


def _release_observation(place: int, reading: Reading, ripe: Mapping[str, Reading]) -> Observation:
    # Old enough but not read since: until the next round its count at the final age is not known.
    count = reading.count if reading.key in ripe else None
    return Observation(place, count, reading.exposure or 1.0)


def _observed(observations: list[Observation], places: list[Place], waiting: int) -> Observed:
    digests = [hashlib.sha256(b"observations 1").hexdigest()[:32]]
    for observation, place in zip(observations, places, strict=True):
        text = f"{digests[-1]} {place.key} {observation!r}"
        digests.append(hashlib.sha256(text.encode("utf-8", "surrogatepass")).hexdigest()[:32])
    return Observed(tuple(observations), tuple(places), tuple(digests), waiting)
