"""From readings to observations: what stands where, what waits, and the digests of the beginnings."""

import datetime
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from detectors.judge import Rule
from detectors.model import Model
from service.round import observe as observing
from service.round.calendar import Axis, Interval, position_of
from service.round.observe import OtherIntervals, Stored, TooManyAbsent, observe
from service.round.plans import CalendarShape, StreamPlan
from storage.readings import Reading

UTC = datetime.UTC
MONDAY = datetime.date(2025, 1, 6)


def at_end_of(week: int, hours: float = 0.0) -> datetime.datetime:
    over = MONDAY + datetime.timedelta(weeks=week + 1)
    return datetime.datetime(over.year, over.month, over.day, tzinfo=UTC) + datetime.timedelta(hours=hours)


def counts(observed) -> list[int | None]:
    return [one.count for one in observed.observations]


def test_an_absent_week_is_missing_or_zero(stream, weeks, reading) -> None:
    stored = Stored([reading(0, 5), reading(1, 6), reading(4, 7)])
    missing = observe(stream(weeks("missing")), stored, at_end_of(9))
    zero = observe(stream(weeks("zero")), stored, at_end_of(9))
    assert counts(missing) == [5, 6, None, None, 7]
    assert counts(zero) == [5, 6, 0, 0, 7]
    first = position_of(weeks().axis, MONDAY)
    assert [one.position for one in missing.observations] == list(range(first, first + 5))
    assert [place.key for place in zero.places][2:4] == ["2025-01-20", "2025-01-27"]
    assert [place.reading_id for place in zero.places] == [1, 2, None, None, 5]


def test_zeros_at_the_end_reach_as_far_as_the_source_does(stream, weeks, reading) -> None:
    stored = Stored([reading(0, 5), reading(1, 6)])
    plan, reaches = stream(weeks("zero")), MONDAY + datetime.timedelta(weeks=4)
    assert counts(observe(plan, stored, at_end_of(9))) == [5, 6]
    assert counts(observe(plan, stored, at_end_of(9), source_reaches=reaches)) == [5, 6, 0, 0, 0]
    # The week that the source has reached is still open.
    assert counts(observe(plan, stored, at_end_of(3, 5), source_reaches=reaches)) == [5, 6, 0, 0]
    missing = stream(weeks("missing"))
    assert counts(observe(missing, stored, at_end_of(9), source_reaches=reaches)) == [5, 6]


def test_an_open_week_waits_and_so_does_one_that_settles(stream, weeks, reading) -> None:
    stored = Stored([reading(0, 5), reading(1, 6), reading(2, 2)])
    open_week = observe(stream(weeks()), stored, at_end_of(1, 30))
    assert (counts(open_week), open_week.waiting) == ([5, 6], 1)
    settling = stream(weeks(settling_hours=48))
    assert counts(observe(settling, stored, at_end_of(2, 47))) == [5, 6]
    assert counts(observe(settling, stored, at_end_of(2, 48))) == [5, 6, 2]
    assert observe(settling, stored, at_end_of(2, 48)).places[-1].ready_utc == at_end_of(2, 48)


def test_nothing_and_nothing_yet(stream, weeks, releases, reading) -> None:
    for shape in (weeks(), releases()):
        assert observe(stream(shape), Stored([]), at_end_of(2)).observations == ()
    future = observe(stream(weeks()), Stored([reading(5, 1)]), at_end_of(2))
    assert (future.observations, future.waiting) == ((), 1)


def test_exposure_and_missing_counts_are_passed_on(stream, weeks, reading) -> None:
    stored = Stored([reading(0, None), reading(1, 6, exposure=0.5), reading(2, 7)])
    observed = observe(stream(weeks()), stored, at_end_of(2))
    assert [(one.count, one.exposure) for one in observed.observations] == [(None, 1.0), (6, 0.5), (7, 1.0)]


def test_readings_of_other_intervals_are_not_taken_for_weeks(stream, weeks, reading) -> None:
    stored = Stored([reading(0, 5), reading(at=datetime.date(2025, 1, 14))])
    with pytest.raises(OtherIntervals, match=r"2025-01-14.*no week"):
        observe(stream(weeks()), stored, at_end_of(9))


def test_dates_too_far_apart_are_refused(stream, weeks, reading, monkeypatch) -> None:
    monkeypatch.setattr(observing, "MOST_FILLED", 10)
    stored = Stored([reading(0, 5), reading(12, 6)])
    with pytest.raises(TooManyAbsent, match="11 absent"):
        observe(stream(weeks()), stored, at_end_of(20))
    # Rows put in far ahead wait and fill nothing.
    assert counts(observe(stream(weeks()), stored, at_end_of(3))) == [5]


def test_releases_in_order_of_their_dates_at_their_final_age(stream, releases, reading) -> None:
    day = datetime.date(2025, 3, 1)
    newest = [
        reading(id=11, key="b", at=day, count=50),
        reading(id=12, key="a", at=day, count=40),
        reading(id=13, key="c", at=datetime.date(2025, 2, 1), count=90),
        reading(id=14, key="d", at=datetime.date(2025, 3, 5), count=7),
    ]
    ripe = [
        reading(id=1, key="a", at=day, count=40),
        reading(id=2, key="b", at=day, count=44),
        reading(id=3, key="c", at=datetime.date(2025, 2, 1), count=80),
    ]
    observed = observe(stream(releases(7)), Stored(newest, ripe), datetime.datetime(2025, 3, 9, tzinfo=UTC))
    assert [(place.key, place.reading_id) for place in observed.places] == [("c", 3), ("a", 1), ("b", 2)]
    assert [(one.position, one.count) for one in observed.observations] == [(0, 80), (1, 40), (2, 44)]
    assert observed.waiting == 1


def test_a_release_not_read_at_its_age_keeps_its_place_or_waits(stream, releases, reading) -> None:
    days = [datetime.date(2025, 3, day) for day in (1, 2, 3)]
    newest = [reading(id=n, key=f"e{n}", at=day, count=n) for n, day in enumerate(days, start=1)]
    now = datetime.datetime(2025, 4, 1, tzinfo=UTC)
    without_second = observe(stream(releases(7)), Stored(newest, [newest[0], newest[2]]), now)
    assert (counts(without_second), without_second.waiting) == ([1, None, 3], 1)
    without_last = observe(stream(releases(7)), Stored(newest, newest[:2]), now)
    assert (counts(without_last), without_last.waiting) == ([1, 2], 1)


def test_the_date_and_title_are_the_newest_the_count_the_ripe_one(stream, releases, reading) -> None:
    newest = [reading(id=9, key="e", at=datetime.date(2025, 3, 2), count=90, title="Part One, mended")]
    ripe = [reading(id=2, key="e", at=datetime.date(2025, 3, 1), count=50, title="Part One")]
    observed = observe(stream(releases(7)), Stored(newest, ripe), datetime.datetime(2025, 4, 1, tzinfo=UTC))
    (place,) = observed.places
    assert (place.at, place.title, place.reading_id) == (datetime.date(2025, 3, 2), "Part One, mended", 2)
    assert counts(observed) == [50]


@given(st.lists(st.integers(0, 50), min_size=2, max_size=12), st.data())
def test_a_changed_count_changes_its_digest_and_all_later_ones(values, data) -> None:
    changed = data.draw(st.integers(0, len(values) - 1))
    other = [count + (number == changed) for number, count in enumerate(values)]
    digests, others = _digests(values), _digests(other)
    assert len(digests) == len(values) + 1
    assert digests[: changed + 1] == others[: changed + 1]
    assert not set(digests[changed + 1 :]) & set(others[changed + 1 :])


def _digests(values: list[int]) -> tuple[str, ...]:
    # Made here, because fixtures stand still between the examples of hypothesis.
    shape = CalendarShape(Axis(Interval("week"), ZoneInfo("UTC")), "missing")
    plan = StreamPlan("s", "s", None, "S", None, shape, Model(), Rule(), "one")
    days = [MONDAY + datetime.timedelta(weeks=number) for number in range(len(values))]
    readings = [
        Reading(number + 1, "s", day.isoformat(), day, None, count, None, at_end_of(number), 1)
        for number, (day, count) in enumerate(zip(days, values, strict=True))
    ]
    return observe(plan, Stored(readings), at_end_of(99)).digests
