"""From announcements to shifts as they are recorded: which may be told, and which are late. Pure."""

import datetime
import hashlib
from collections.abc import Mapping
from dataclasses import dataclass

from detectors.posterior import Announcement
from service.round.lateness import Downtime, is_late
from service.round.observe import Observed, Place
from storage.shifts import EMERGING, HISTORY, LIVE, Shift


@dataclass(frozen=True, slots=True)
class Circumstances:
    """What decides whether an announcement may be told.

    `first_read_utc` is the stream's first poll. `known_before` is the number of places that had been folded
    under other settings: what is first seen there now was there to be seen before. `downtimes` are the times
    in which the source was not read, though it should have been.
    """

    stream_id: str
    first_read_utc: datetime.datetime
    known_before: int
    downtimes: tuple[Downtime, ...]
    now: datetime.datetime
    fingerprint: str
    reading_id: int | None


def shifts_of(
    announcements: tuple[Announcement, ...], observed: Observed, circumstances: Circumstances
) -> tuple[Shift, ...]:
    """The shifts that these announcements stand for."""
    index = {observation.position: place for place, observation in enumerate(observed.observations)}
    return tuple(_shift(one, observed, index, circumstances) for one in announcements)


def shift_id(stream_id: str, announced_key: str, start_key: str) -> str:
    """A stable id: the same announcement, made again after a crash or a re-fold, has the same."""
    text = f"{stream_id}\n{announced_key}\n{start_key}"
    return "shift_" + hashlib.sha256(text.encode("utf-8", "surrogatepass")).hexdigest()[:20]


def _shift(
    announcement: Announcement, observed: Observed, index: Mapping[int, int], circumstances: Circumstances
) -> Shift:
    announced_place = index[announcement.position]
    announced = observed.places[announced_place]
    start = observed.places[index[announcement.start_position]]
    return Shift(
        id=shift_id(circumstances.stream_id, announced.key, start.key),
        stream_id=circumstances.stream_id,
        origin=_origin(announced_place, announced, circumstances),
        state=EMERGING,
        announced_key=announced.key,
        announced_position=announcement.position,
        announced_at=announced.at,
        announced_utc=circumstances.now,
        start_key=start.key,
        start_position=announcement.start_position,
        start_at=start.at,
        region=announcement.region,
        probability=announcement.probability,
        level_before=announcement.level_before,
        level_after=announcement.level_after,
        late=is_late(announced, circumstances.downtimes),
        fingerprint=circumstances.fingerprint,
        reading_id=circumstances.reading_id,
        figures=_figures(announcement, observed, index),
    )


def _origin(place: int, announced: Place, circumstances: Circumstances) -> str:
    """Only a shift whose announcing count became complete after the stream's first poll may be told."""
    older = announced.ready_utc <= circumstances.first_read_utc
    return HISTORY if older or place < circumstances.known_before else LIVE


def _figures(announcement: Announcement, observed: Observed, index: Mapping[int, int]) -> dict[str, object]:
    """What words need besides: the keys of the date region and the titles of start and announcing release."""
    places = [observed.places[index[position]] for position in announcement.region]
    start = observed.places[index[announcement.start_position]]
    announced = observed.places[index[announcement.position]]
    return {
        "region": [{"key": place.key, "at": place.at.isoformat(), "title": place.title} for place in places],
        "start_title": start.title,
        "announced_title": announced.title,
        "ready_utc": announced.ready_utc.isoformat(),
        "counts_since": index[announcement.position] - index[announcement.start_position] + 1,
    }
