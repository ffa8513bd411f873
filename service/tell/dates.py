"""Where a shift lies, in words: dates of ISO 8601, and titles where counts belong to releases. Pure."""

import datetime
from collections.abc import Sequence

from service.tell.plain import plain
from service.tell.story import At, Marker, ShiftStory

MOST_STRETCHES = 3
LONGEST_TITLE = 80


def since_words(story: ShiftStory) -> str:
    """From when on, and between which dates it may be: never one span where the region has gaps."""
    start = marker_words(story, story.start)
    region = region_words(story)
    return f"most probably from {start}" + (f" (90 %: {region})" if region else "")


def region_words(story: ShiftStory) -> str:
    """The stretches of the date region; empty when it is the start alone."""
    stretches = stretches_of(story.region)
    if not stretches or (len(story.region) == 1 and story.region[0].position == story.start.position):
        return ""
    if len(stretches) > MOST_STRETCHES:
        first, last = stretches[0][0], stretches[-1][-1]
        span = f"between {_at(story, first)} and {_at(story, last)}"
        return f"in one of {len(stretches)} stretches {span}"
    return ", or ".join(_stretch(story, stretch) for stretch in stretches)


def stretches_of(region: Sequence[Marker]) -> list[list[Marker]]:
    """The region cut where positions are left out."""
    stretches: list[list[Marker]] = []
    for marker in region:
        if stretches and marker.position == stretches[-1][-1].position + 1:
            stretches[-1].append(marker)
        else:
            stretches.append([marker])
    return stretches


def marker_words(story: ShiftStory, marker: Marker) -> str:
    """A release by its title and date, an interval by its date."""
    title = plain(marker.title or "", longest=LONGEST_TITLE)
    at = _at(story, marker)
    return f'"{title}" of {at}' if story.shape == "release" and title else at


def at_words(at: At, unit: str | None) -> str:
    """A date, as long as the unit needs: 2026, 2026-03, 2026-03-02, or an instant with its offset."""
    if isinstance(at, datetime.datetime):
        return at.isoformat(timespec="minutes")
    lengths = {"year": 4, "month": 7}
    return at.isoformat()[: lengths.get(unit or "", 10)]


def instant_words(instant: datetime.datetime) -> str:
    """An instant in UTC, to the minute."""
    return instant.astimezone(datetime.UTC).strftime("%Y-%m-%d %H:%M UTC")


def _stretch(story: ShiftStory, stretch: Sequence[Marker]) -> str:
    first, last = _at(story, stretch[0]), _at(story, stretch[-1])
    return first if len(stretch) == 1 else f"between {first} and {last}"


def _at(story: ShiftStory, marker: Marker) -> str:
    return at_words(marker.at, story.unit)
