"""Which announcements may be told."""

import datetime

import pytest

from detectors.posterior import Announcement, Quantiles
from service.round.lateness import Downtime
from service.round.observe import Stored, observe
from service.round.shifts import Circumstances, shift_id, shifts_of
from storage.shifts import HISTORY, LIVE

UTC = datetime.UTC
MONDAY = datetime.date(2025, 1, 6)


@pytest.fixture
def observed(stream, weeks, reading):
    stored = Stored([reading(number, 10, title=f"week {number}") for number in range(10)])
    return observe(stream(weeks()), stored, datetime.datetime(2025, 6, 1, tzinfo=UTC))


def _announcement(observed, announced: int, start: int) -> Announcement:
    first = observed.observations[0].position
    region = tuple(first + place for place in range(start - 1, start + 1))
    before, after = Quantiles(90, 100, 110), Quantiles(40, 50, 60)
    return Announcement(first + announced, first + start, region, 0.95, before, after)


def _circumstances(first_read: datetime.datetime, known_before: int = 0, stretches=()) -> Circumstances:
    now = datetime.datetime(2025, 6, 1, tzinfo=UTC)
    return Circumstances("plays/quay", first_read, known_before, stretches, now, "one", 10)


def _over(week: int, hours: float = 0.0) -> datetime.datetime:
    day = MONDAY + datetime.timedelta(weeks=week + 1)
    return datetime.datetime(day.year, day.month, day.day, tzinfo=UTC) + datetime.timedelta(hours=hours)


@pytest.mark.parametrize(
    ("first_read", "origin"),
    [(_over(7, -1), LIVE), (_over(7), HISTORY), (_over(7, 1), HISTORY), (_over(9), HISTORY)],
)
def test_what_was_complete_at_the_first_poll_is_history(observed, first_read, origin) -> None:
    (shift,) = shifts_of((_announcement(observed, 7, 4),), observed, _circumstances(first_read))
    assert shift.origin == origin


@pytest.mark.parametrize(("known_before", "origin"), [(0, LIVE), (7, LIVE), (8, HISTORY), (10, HISTORY)])
def test_what_other_settings_had_folded_is_history(observed, known_before, origin) -> None:
    circumstances = _circumstances(_over(-1), known_before)
    (shift,) = shifts_of((_announcement(observed, 7, 4),), observed, circumstances)
    assert shift.origin == origin


def test_late(observed) -> None:
    stretches = (Downtime(_over(5), _over(8)),)
    told = shifts_of(
        tuple(_announcement(observed, announced, announced - 3) for announced in (7, 8)),
        observed,
        _circumstances(_over(-1), stretches=stretches),
    )
    assert [shift.late for shift in told] == [True, False]


def test_everything_that_words_need_is_there(observed) -> None:
    (shift,) = shifts_of((_announcement(observed, 7, 4),), observed, _circumstances(_over(-1)))
    assert (shift.announced_key, shift.start_key) == ("2025-02-24", "2025-02-03")
    assert shift.id == shift_id("plays/quay", "2025-02-24", "2025-02-03")
    assert shift.figures == {
        "region": [
            {"key": "2025-01-27", "at": "2025-01-27", "title": "week 3"},
            {"key": "2025-02-03", "at": "2025-02-03", "title": "week 4"},
        ],
        "start_title": "week 4",
        "announced_title": "week 7",
        "ready_utc": "2025-03-03T00:00:00+00:00",
        "counts_since": 4,
    }


def test_ids_are_stable_and_apart() -> None:
    assert shift_id("a", "b", "c") == shift_id("a", "b", "c")
    assert len({shift_id("a", "b", "c"), shift_id("a", "c", "b"), shift_id("ab", "", "c")}) == 3
