"""Rows to streams and keys, and when a count can be complete; days and clock changes worked out by hand."""

import datetime
from zoneinfo import ZoneInfo

from service.round.calendar import Axis, Interval
from service.round.keys import ready_utc, sort_rows
from service.round.plans import CalendarShape
from service.sources.document import Row

UTC = datetime.UTC
NOW = datetime.datetime(2026, 4, 1, tzinfo=UTC)
DAY = datetime.date


def _hours(zone: str) -> CalendarShape:
    return CalendarShape(Axis(Interval("hour"), ZoneInfo(zone)), "missing")


def test_a_day_within_a_week_is_that_week(source, weeks) -> None:
    rows = [Row("quay", DAY(2026, 3, 4), 5, number=1), Row("quay", DAY(2026, 3, 9), 6, number=2)]
    ((plan, readings),) = sort_rows(rows, source(weeks()), NOW).by_stream
    assert plan.id == "plays/quay"
    assert [(one.key, one.at, one.count) for one in readings] == [
        ("2026-03-02", DAY(2026, 3, 2), 5),
        ("2026-03-09", DAY(2026, 3, 9), 6),
    ]


def test_an_instant_belongs_to_the_interval_of_its_own_zone(source, weeks) -> None:
    # 23:30 UTC on Sunday is 00:30 on Monday in Berlin.
    rows = [Row("quay", datetime.datetime(2026, 3, 1, 23, 30, tzinfo=UTC), 5)]
    for zone, key in (("UTC", "2026-02-23"), ("Europe/Berlin", "2026-03-02")):
        ((_, readings),) = sort_rows(rows, source(weeks(zone=zone)), NOW).by_stream
        assert readings[0].key == key


def test_both_hours_of_the_night_in_which_clocks_go_back(source) -> None:
    # Berlin, 25 October 2026: 02:00 comes at 00:00 UTC and again at 01:00 UTC.
    rows = [Row("quay", datetime.datetime(2026, 10, 25, hour, tzinfo=UTC), hour) for hour in (0, 1)]
    ((_, readings),) = sort_rows(rows, source(_hours("Europe/Berlin")), NOW).by_stream
    assert [one.key for one in readings] == ["2026-10-25T02:00+02:00", "2026-10-25T02:00+01:00"]


def test_when_a_week_is_over(weeks) -> None:
    # Berlin is an hour before UTC until 29 March 2026, two after; the week ends on Monday, 00:00 there.
    shape = weeks(settling_hours=3, zone="Europe/Berlin")
    assert ready_utc(shape, DAY(2026, 3, 16)) == datetime.datetime(2026, 3, 23, 2, tzinfo=UTC)
    assert ready_utc(shape, DAY(2026, 3, 23)) == datetime.datetime(2026, 3, 30, 1, tzinfo=UTC)


def test_when_a_release_is_final(releases) -> None:
    shape = releases(7, "Europe/Berlin")
    assert ready_utc(shape, DAY(2026, 1, 10)) == datetime.datetime(2026, 1, 16, 23, tzinfo=UTC)
    # Seven times 24 hours of age, whatever clocks do meanwhile.
    assert ready_utc(shape, DAY(2026, 3, 25)) == datetime.datetime(2026, 3, 31, 23, tzinfo=UTC)
    at = datetime.datetime(2026, 1, 10, 6, tzinfo=ZoneInfo("Europe/Berlin"))
    assert ready_utc(shape, at) == datetime.datetime(2026, 1, 17, 5, tzinfo=UTC)


def test_releases_go_by_their_id_and_without_one_by_their_moment(source, releases) -> None:
    berlin = datetime.datetime(2026, 3, 1, 8, tzinfo=ZoneInfo("Europe/Berlin"))
    rows = [
        Row("quay", DAY(2026, 3, 1), 5, release="e-7", title="The Ferry", number=1),
        Row("quay", berlin, 6, number=2),
        Row("mill", DAY(2026, 3, 1), 7, number=3),
    ]
    (mill, quay) = sort_rows(rows, source(releases()), NOW).by_stream
    assert [one.key for one in mill[1]] == ["2026-03-01"]
    # The same instant, however its offset is written.
    assert [one.key for one in quay[1]] == ["e-7", "2026-03-01T07:00:00+00:00"]


def test_a_key_that_comes_twice_with_different_counts_is_kept_out(source, weeks) -> None:
    monday, tuesday = DAY(2026, 3, 2), DAY(2026, 3, 3)
    rows = [
        Row("quay", monday, 5, number=1),
        Row("quay", tuesday, 6, number=2),
        Row("quay", DAY(2026, 3, 9), 7, number=3),
        Row("quay", DAY(2026, 3, 9), 7, number=4),
        Row("mill", monday, 9, number=5),
    ]
    found = sort_rows(rows, source(weeks()), NOW)
    assert [one.row for one in found.kept_out] == [1, 2]
    assert [(plan.split, [one.count for one in readings]) for plan, readings in found.by_stream] == [
        ("mill", [9]),
        ("quay", [7]),
    ]


def test_rows_without_numbers_are_told_apart_all_the_same(source, weeks) -> None:
    rows = [Row("quay", DAY(2026, 3, 2), 5), Row("mill", DAY(2026, 3, 2), 6)]
    found = sort_rows(rows, source(weeks()), NOW)
    assert [(plan.id, readings[0].count) for plan, readings in found.by_stream] == [
        ("plays/mill", 6),
        ("plays/quay", 5),
    ]


def test_splits_that_the_settings_leave_out(source, weeks) -> None:
    rows = [Row("no", DAY(2026, 3, 2), 5), Row("quay", DAY(2026, 3, 2), 6), Row("no", DAY(2026, 3, 2), 7)]
    found = sort_rows(rows, source(weeks()), NOW)
    assert (found.left_out, len(found.by_stream), found.kept_out) == (2, 1, ())


def test_what_is_final(source, weeks, releases) -> None:
    now = datetime.datetime(2026, 3, 16, tzinfo=UTC)
    rows = [
        Row("quay", DAY(2026, 3, 2) + datetime.timedelta(days=7 * n), n, release=str(n)) for n in range(3)
    ]
    # A week is final seven days after its end, a release at its age.
    for shape, final in ((weeks(), [True, False, False]), (releases(7), [True, True, False])):
        ((_, readings),) = sort_rows(rows, source(shape), now).by_stream
        assert [one.final for one in readings] == final
