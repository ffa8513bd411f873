"""One sentence about a shift: what moved, by how much and since when. Pure."""

import math

from service.tell.dates import instant_words, since_words
from service.tell.effect import moved_words
from service.tell.plain import plain
from service.tell.story import ShiftStory

CAUTION = (
    "A date in common is not a cause; look at what else changed then before deciding anything about "
    "people's work."
)


def sentence(story: ShiftStory) -> str:
    """The alert in one sentence, with a second one if it comes late."""
    first = (
        f"{title_words(story)}: the filtered level {moved_words(story.level_before, story.level_after)} "
        f"{unit_words(story)}, "
        f"{since_words(story)}; {probability_words(story.probability)}."
    )
    return f"{first} {late_words(story)}" if story.late else first


def title_words(story: ShiftStory) -> str:
    """The stream's title, or its id where the title has nothing to be seen."""
    return plain(story.title) or plain(story.stream_id) or "a stream without a title"


def unit_words(story: ShiftStory) -> str:
    """What a level counts: per release, per week."""
    return f"counts per {story.unit or ('release' if story.shape == 'release' else 'interval')}"


def probability_words(probability: float) -> str:
    """Two decimals, but never a certainty that was not computed."""
    if not math.isfinite(probability):
        return "probability of a recent shift unknown"
    if 0.995 <= probability < 1:
        digits = f"{math.floor(probability * 1e4) / 1e4:.4f}".rstrip("0")
        return f"probability of a recent shift {'above 0.9999' if probability > 0.9999 else digits}"
    return f"probability of a recent shift {probability:.2f}"


def late_words(story: ShiftStory) -> str:
    """Why the alert comes late."""
    noticed = instant_words(story.announced_utc)
    if story.readable_utc is None:
        return f"This alert is late: the counts were there before they were read, at {noticed}."
    ready = instant_words(story.readable_utc)
    return f"This alert is late: its last count was complete at {ready} but was only read by {noticed}."
