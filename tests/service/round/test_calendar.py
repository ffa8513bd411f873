"""Intervals against the calendar itself: ISO 8601, the zone database, and what must hold always."""

import datetime
from zoneinfo import ZoneInfo

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from service.round.calendar import (
    Axis,
    Interval,
    UnusableInterval,
    at_of,
    end_of,
    key_of,
    label_of,
    last_over,
    parse_interval,
    position_of,
    start_of,
)

UTC = datetime.UTC
BERLIN = ZoneInfo("Europe/Berlin")
# Chosen for their oddities: clocks change at midnight, by half an hour, at one minute past midnight, a whole
# day left out, a fraction of an hour, half past eleven in 1919.
ZONES = [
    ZoneInfo(name)
    for name in (
        "UTC",
        "Europe/Berlin",
        "America/Sao_Paulo",
        "Australia/Lord_Howe",
        "America/St_Johns",
        "Pacific/Apia",
        "Asia/Kathmandu",
        "America/Toronto",
        "America/Havana",
    )
]
INTERVALS = [
    Interval("hour"),
    Interval("day"),
    Interval("day", 3),
    Interval("day", 14),
    Interval("week"),
    Interval("month"),
    Interval("year"),
]
AXES = st.builds(
    Axis,
    st.sampled_from(INTERVALS),
    st.sampled_from(ZONES),
    st.dates(datetime.date(1950, 1, 1), datetime.date(2050, 1, 1)),
)
INSTANTS = st.datetimes(
    datetime.datetime(1910, 1, 1),  # noqa: DTZ001 - the zone is drawn below
    datetime.datetime(2090, 1, 1),  # noqa: DTZ001
    timezones=st.sampled_from([UTC, *ZONES]),
)
DAYS = st.dates(datetime.date(1910, 1, 1), datetime.date(2090, 1, 1))


@settings(max_examples=400)
@given(AXES, INSTANTS)
def test_an_instant_lies_in_its_interval(axis: Axis, at: datetime.datetime) -> None:
    position = position_of(axis, at)
    assert start_of(axis, position) <= at < end_of(axis, position)


@settings(max_examples=200)
@given(AXES, INSTANTS, st.integers(0, 10**7))
def test_later_instants_never_lie_earlier(axis: Axis, at: datetime.datetime, seconds: int) -> None:
    later = at.astimezone(UTC) + datetime.timedelta(seconds=seconds)
    assert position_of(axis, later) >= position_of(axis, at)


@given(AXES, DAYS)
def test_the_calendar_value_of_an_interval_leads_back_to_it(axis: Axis, day: datetime.date) -> None:
    position = position_of(axis, day)
    assert position_of(axis, at_of(axis, position)) == position


@given(AXES, DAYS)
@example(Axis(Interval("hour"), ZoneInfo("Africa/Monrovia")), datetime.date(1935, 1, 1))
def test_keys_and_labels_are_iso_8601_and_tell_neighbours_apart(axis: Axis, day: datetime.date) -> None:
    position = position_of(axis, day)
    assert key_of(axis, position) != key_of(axis, position + 1)
    assert label_of(axis, position) != label_of(axis, position + 1)
    read_back = datetime.datetime.fromisoformat(key_of(axis, position))
    if axis.interval.unit == "hour":
        assert read_back == start_of(axis, position)
    else:
        assert position_of(axis, read_back.date()) == position


@given(st.sampled_from(ZONES), DAYS)
def test_consecutive_days_have_consecutive_positions(zone: ZoneInfo, day: datetime.date) -> None:
    axis = Axis(Interval("day"), zone)
    assert position_of(axis, day + datetime.timedelta(days=1)) == position_of(axis, day) + 1


@given(st.integers(1, 60), DAYS, st.integers(0, 4000))
def test_days_of_one_interval_share_its_position(days: int, anchor: datetime.date, offset: int) -> None:
    axis = Axis(Interval("day", days), BERLIN, anchor)
    assert position_of(axis, anchor + datetime.timedelta(days=offset)) == offset // days


@pytest.mark.parametrize(
    ("month", "day", "hours"),
    [(3, 29, 23), (10, 25, 25), (6, 1, 24)],
)
def test_a_day_has_as_many_hours_as_the_clocks_give_it(month: int, day: int, hours: int) -> None:
    # European Union, directive 2000/84/EC: last Sundays of March and October, 29 March and 25 October 2026.
    axis = Axis(Interval("day"), BERLIN)
    position = position_of(axis, datetime.date(2026, month, day))
    assert end_of(axis, position) - start_of(axis, position) == datetime.timedelta(hours=hours)


def test_the_hour_that_comes_twice_is_two_hours() -> None:
    axis = Axis(Interval("hour"), BERLIN)
    first = datetime.datetime.fromisoformat("2026-10-25T02:00+02:00")
    second = datetime.datetime.fromisoformat("2026-10-25T02:00+01:00")
    assert position_of(axis, second) == position_of(axis, first) + 1
    assert key_of(axis, position_of(axis, first)) == "2026-10-25T02:00+02:00"
    assert key_of(axis, position_of(axis, second)) == "2026-10-25T02:00+01:00"


def test_hours_begin_where_the_zone_has_them_begin() -> None:
    axis = Axis(Interval("hour"), ZoneInfo("Asia/Kathmandu"))
    position = position_of(axis, datetime.datetime.fromisoformat("2026-03-02T14:30+05:45"))
    assert key_of(axis, position) == "2026-03-02T14:00+05:45"


def test_an_instant_belongs_to_the_day_of_the_streams_zone() -> None:
    late = datetime.datetime.fromisoformat("2026-03-02T23:30+00:00")
    axis = Axis(Interval("day"), BERLIN)
    assert label_of(axis, position_of(axis, late)) == "2026-03-03"


def test_a_day_is_never_converted() -> None:
    for zone in ZONES:
        axis = Axis(Interval("day"), zone)
        assert key_of(axis, position_of(axis, datetime.date(2026, 3, 2))) == "2026-03-02"


@pytest.mark.parametrize(
    ("day", "label", "key"),
    # ISO 8601: week 1 holds the first Thursday; 2020 has 53 weeks.
    [
        ("2021-01-03", "2020-W53", "2020-12-28"),
        ("2021-01-04", "2021-W01", "2021-01-04"),
        ("2018-12-31", "2019-W01", "2018-12-31"),
    ],
)
def test_weeks_are_those_of_iso_8601(day: str, label: str, key: str) -> None:
    axis = Axis(Interval("week"), BERLIN)
    position = position_of(axis, datetime.date.fromisoformat(day))
    assert (label_of(axis, position), key_of(axis, position)) == (label, key)


def test_months_and_years() -> None:
    month, year = Axis(Interval("month"), BERLIN), Axis(Interval("year"), BERLIN)
    last, first = datetime.date(2025, 12, 31), datetime.date(2026, 1, 1)
    assert position_of(month, first) == position_of(month, last) + 1
    assert position_of(year, first) == position_of(year, last) + 1
    assert key_of(month, position_of(month, last)) == "2025-12-01"
    assert label_of(month, position_of(month, last)) == "2025-12"
    assert label_of(year, position_of(year, last)) == "2025"


def test_a_day_that_the_clocks_left_out_is_empty() -> None:
    # Samoa crossed the date line: 30 December 2011 did not happen there.
    axis = Axis(Interval("day"), ZoneInfo("Pacific/Apia"))
    gone = position_of(axis, datetime.date(2011, 12, 30))
    assert start_of(axis, gone) == end_of(axis, gone)


def test_an_interval_still_open_is_not_over() -> None:
    axis = Axis(Interval("week"), BERLIN)
    sunday = datetime.datetime(2026, 3, 8, 23, 59, tzinfo=BERLIN)
    monday = datetime.datetime(2026, 3, 9, 0, 0, tzinfo=BERLIN)
    assert label_of(axis, last_over(axis, sunday)) == "2026-W09"
    assert label_of(axis, last_over(axis, monday)) == "2026-W10"


@pytest.mark.parametrize(
    ("text", "interval"),
    [
        ("hour", Interval("hour")),
        ("Week", Interval("week")),
        ("1 day", Interval("day")),
        (" 14  days ", Interval("day", 14)),
    ],
)
def test_intervals_are_read(text: str, interval: Interval) -> None:
    assert parse_interval(text) == interval


@pytest.mark.parametrize("interval", INTERVALS)
def test_what_an_interval_prints_can_be_read_again(interval: Interval) -> None:
    assert parse_interval(str(interval)) == interval


@pytest.mark.parametrize("text", ["", "fortnight", "0 days", "-1 days", "1.5 days", "9999 days", "weeks"])
def test_other_texts_are_refused_with_what_was_got(text: str) -> None:
    with pytest.raises(UnusableInterval) as caught:
        parse_interval(text)
    assert repr(text) in str(caught.value) or "day" in str(caught.value)
