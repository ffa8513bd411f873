"""From stored readings to observations: which count stands where, and which still wait. Pure."""

import datetime
import hashlib
from collections.abc import Iterable, Sequence
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
    """What stands at one place of a stream: its key and date, and the reading it rests on (None: absent).

    From `ready_utc` on the count can be complete; at `read_utc` it was read (None: absent).
    """

    key: str
    at: At
    title: str | None
    reading_id: int | None
    ready_utc: datetime.datetime
    read_utc: datetime.datetime | None


@dataclass(frozen=True, slots=True)
class Observed:
    """A stream's observations in order, with the place of each and the digest of each beginning.

    `digests[n]` is the digest of the first n observations, so it has one entry more than there are. `waiting`
    counts the keys that are not yet counted: an open interval, a release younger than its final age, or one
    that was not read since it came to that age.
    """

    observations: tuple[Observation, ...]
    places: tuple[Place, ...]
    digests: tuple[str, ...]
    waiting: int


class UnusableReadings(ValueError):
    """A stream's readings cannot be put into one series."""


class OtherIntervals(UnusableReadings):
    """Stored counts cover other intervals than the settings now say, so they cannot stand in one series."""

    def __init__(self, stream_id: str, key: str, interval: str) -> None:
        super().__init__(
            f"Stream {stream_id!r} holds a count for {key!r}, which is no {interval} of its settings now. "
            "Put the former interval and zone back, or rename the source, so that its streams begin anew."
        )


class TooManyAbsent(UnusableReadings):
    """The dates of a stream lie so far apart that filling what lies between would never end."""

    def __init__(self, stream_id: str, absent: int) -> None:
        super().__init__(
            f"Stream {stream_id!r} has {absent} absent intervals, more than {MOST_FILLED}: its dates or its "
            "interval must be wrong. Correct the source or the setting `interval`; as what was stored stays, "
            "rename the source too if it had a wrong date, so that its streams begin anew."
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
    it was; its date and title are the newest. One that was not read since it came to that age keeps its place
    as a missing count if later ones are known, and waits if not. `source_reaches` is the newest date of the
    whole source: up to there an absent interval can be taken for zero; beyond it the source may be behind.

    Raises
    ------
    OtherIntervals
        If the readings were stored for another interval or zone.
    TooManyAbsent
        If filling the absent intervals would not end.
    """
    if isinstance(plan.shape, CalendarShape):
        return _calendar(plan, plan.shape, stored.newest, now, source_reaches)
    return _releases(plan.shape, stored, now)


def place_readings(stream_id: str, shape: CalendarShape, readings: Sequence[Reading]) -> dict[int, Reading]:
    """The readings of a calendar stream by the position of their interval.

    Raises
    ------
    OtherIntervals
        If one was stored for another interval or zone.
    """
    by_position = {}
    for reading in readings:
        position = position_of(shape.axis, reading.at)
        if reading.key != key_of(shape.axis, position):
            raise OtherIntervals(stream_id, reading.key, str(shape.axis.interval))
        by_position[position] = reading
    return by_position


def _calendar(
    plan: StreamPlan,
    shape: CalendarShape,
    readings: Sequence[Reading],
    now: datetime.datetime,
    reaches: At | None,
) -> Observed:
    by_position = place_readings(plan.id, shape, readings)
    over = last_over(shape.axis, now - shape.settling)
    # What was put in ahead waits, and says nothing of the intervals before it.
    begun = [position for position in by_position if position <= position_of(shape.axis, now)]
    if not begun:
        return _observed([], [], len(by_position))
    first, end = min(begun), min(_last_known(shape, begun, reaches), over)
    absent = end - first + 1 - sum(position <= end for position in by_position)
    if absent > MOST_FILLED:
        raise TooManyAbsent(plan.id, absent)
    positions = range(first, end + 1)
    return _observed(
        [_calendar_observation(shape, position, by_position.get(position)) for position in positions],
        [_calendar_place(shape, position, by_position.get(position)) for position in positions],
        sum(position > over for position in by_position),
    )


def _last_known(shape: CalendarShape, known: Iterable[int], reaches: At | None) -> int:
    newest = max(known)
    if reaches is None or shape.absent != "zero":
        return newest
    return max(newest, position_of(shape.axis, reaches))


def _calendar_observation(shape: CalendarShape, position: int, reading: Reading | None) -> Observation:
    if reading is None:
        return Observation(position, 0 if shape.absent == "zero" else None)
    return Observation(position, reading.count, _exposure(reading))


def _calendar_place(shape: CalendarShape, position: int, reading: Reading | None) -> Place:
    at = at_of(shape.axis, position)
    key, ready = key_of(shape.axis, position), ready_utc(shape, at)
    if reading is None:
        return Place(key, at, None, None, ready, None)
    return Place(key, at, reading.title, reading.id, ready, reading.read_utc)


def _releases(shape: ReleaseShape, stored: Stored, now: datetime.datetime) -> Observed:
    ripe = {reading.key: reading for reading in stored.ripe}
    ordered = sorted(stored.newest, key=lambda reading: (came_out_utc(shape, reading.at), reading.key))
    of_age = [reading for reading in ordered if ready_utc(shape, reading.at) <= now]
    while of_age and of_age[-1].key not in ripe:
        of_age.pop()
    return _observed(
        [_release_observation(place, ripe.get(reading.key)) for place, reading in enumerate(of_age)],
        [_release_place(shape, reading, ripe.get(reading.key)) for reading in of_age],
        sum(reading.key not in ripe or ready_utc(shape, reading.at) > now for reading in ordered),
    )


def _release_observation(place: int, ripe: Reading | None) -> Observation:
    # Old enough but not read since: its count at the final age is not known.
    return Observation(place, None) if ripe is None else Observation(place, ripe.count, _exposure(ripe))


def _release_place(shape: ReleaseShape, newest: Reading, ripe: Reading | None) -> Place:
    ready = ready_utc(shape, newest.at)
    if ripe is None:
        return Place(newest.key, newest.at, newest.title, None, ready, None)
    return Place(newest.key, newest.at, newest.title, ripe.id, ready, ripe.read_utc)


def _exposure(reading: Reading) -> float:
    return 1.0 if reading.exposure is None else reading.exposure


def _observed(observations: list[Observation], places: list[Place], waiting: int) -> Observed:
    digests = [hashlib.sha256(b"observations 1").hexdigest()[:32]]
    for observation, place in zip(observations, places, strict=True):
        text = f"{digests[-1]} {place.key} {observation!r}"
        digests.append(hashlib.sha256(text.encode("utf-8", "surrogatepass")).hexdigest()[:32])
    return Observed(tuple(observations), tuple(places), tuple(digests), waiting)
