"""A reading is stored when it differs from the newest of its key; the head says where a stream stands."""

from datetime import UTC, date, datetime, timedelta

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from storage.engine import Store
from storage.errors import HeadMoved, KeyTwice
from storage.readings import (
    Head,
    Kept,
    NewReading,
    head,
    keep_readings,
    key_readings,
    newest_readings,
    require_head,
)
from storage.streams import SeenStream, bump_epoch, see_streams

DAY = date(2026, 3, 1)


def episode(key: str, count: int | None, **more) -> NewReading:
    return NewReading(key=key, at=more.pop("at", DAY), count=count, **more)


def counts(store: Store, stream: str, key: str) -> list[int | None]:
    with store.reading() as conn:
        return [reading.count for reading in key_readings(conn, stream, key)]


def test_only_what_differs_is_stored(store: Store, stream: str, now: datetime):
    with store.writing() as conn:
        first = keep_readings(conn, stream, [episode("a", 1), episode("b", 2)], now=now)
        again = keep_readings(conn, stream, [episode("a", 1), episode("b", 3)], now=now + timedelta(hours=1))
        fewer = keep_readings(conn, stream, [episode("c", 4)], now=now + timedelta(hours=2))
    assert first == Kept(stored=2, unchanged=0, held=0, absent=0, newest_id=first.newest_id)
    assert again == Kept(stored=1, unchanged=1, held=0, absent=0, newest_id=first.newest_id + 1)
    assert fewer == Kept(stored=1, unchanged=0, held=0, absent=2, newest_id=first.newest_id + 2)
    assert counts(store, stream, "b") == [2, 3]
    with store.reading() as conn:
        found = newest_readings(conn, stream)
        assert [(one.key, one.count, one.read_utc) for one in found] == [
            ("a", 1, now),
            ("b", 3, now + timedelta(hours=1)),
            ("c", 4, now + timedelta(hours=2)),
        ]


@pytest.mark.parametrize(
    "changed",
    [
        episode("a", 2, title="One", exposure=0.5),
        episode("a", None, title="One", exposure=0.5),
        episode("a", 1, title="Uno", exposure=0.5),
        episode("a", 1, title=None, exposure=0.5),
        episode("a", 1, title="One", exposure=0.25),
        episode("a", 1, title="One", exposure=None),
        episode("a", 1, title="One", exposure=0.5, at=date(2026, 3, 2)),
        episode("a", 1, title="One", exposure=0.5, at=datetime(2026, 3, 1, tzinfo=UTC)),
    ],
)
def test_any_difference_counts(store: Store, stream: str, now: datetime, changed: NewReading):
    with store.writing() as conn:
        keep_readings(conn, stream, [episode("a", 1, title="One", exposure=0.5)], now=now)
        assert keep_readings(conn, stream, [changed], now=now).stored == 1
        assert keep_readings(conn, stream, [changed], now=now).unchanged == 1


def test_a_number_that_comes_back_is_a_new_reading(store: Store, stream: str, now: datetime):
    with store.writing() as conn:
        for count in (5, 6, 5):
            keep_readings(conn, stream, [episode("a", count)], now=now)
    assert counts(store, stream, "a") == [5, 6, 5]


def test_past_final_one_a_day_unless_it_falls(store: Store, stream: str):
    start = datetime(2026, 3, 2, 22, 0, tzinfo=UTC)
    polled = [
        (0, 100),
        (0.5, 101),
        (1, 102),
        (1.5, 99),
        (1.75, 103),
        (2, 103),
        (2.5, 104),
        (12, 105),
        (26, 106),
    ]
    held = 0
    for hours, count in polled:
        with store.writing() as conn:
            row = episode("a", count, final=True)
            held += keep_readings(conn, stream, [row], now=start + timedelta(hours=hours)).held
    # 22:00 100; the fall to 99; past midnight 103, then one on each later day.
    assert counts(store, stream, "a") == [100, 99, 103, 106]
    assert held == 5


def test_past_final_a_count_that_goes_and_comes_back_is_kept_at_once(store: Store, stream: str, now):
    with store.writing() as conn:
        for count in (7, None, 9, 10):
            keep_readings(conn, stream, [episode("a", count, final=True)], now=now)
    assert counts(store, stream, "a") == [7, None, 9]


def test_a_day_is_a_utc_day_whatever_the_zone_of_now(store: Store, stream: str):
    from zoneinfo import ZoneInfo

    late = datetime(2026, 3, 2, 23, 30, tzinfo=ZoneInfo("America/New_York"))
    with store.writing() as conn:
        keep_readings(conn, stream, [episode("a", 1, final=True)], now=late)
        kept = keep_readings(conn, stream, [episode("a", 2, final=True)], now=late + timedelta(hours=1))
    assert kept.held == 1


def test_a_key_twice(store: Store, stream: str, now: datetime):
    with store.writing() as conn:
        assert keep_readings(conn, stream, [episode("a", 1), episode("a", 1)], now=now).stored == 1
    with pytest.raises(KeyTwice, match="two different readings for 'a'"), store.writing() as conn:
        keep_readings(conn, stream, [episode("b", 1), episode("a", 1), episode("a", 2)], now=now)
    with store.reading() as conn:
        assert [one.key for one in newest_readings(conn, stream)] == ["a"]


def test_order_is_that_of_time_then_key(store: Store, stream: str, now: datetime):
    rows = [episode("b", 1), episode("z", 2, at=date(2026, 2, 1)), episode("a", 3)]
    with store.writing() as conn:
        keep_readings(conn, stream, rows, now=now)
        assert [one.key for one in newest_readings(conn, stream)] == ["z", "a", "b"]


def test_instants_are_compared_as_instants(store: Store, stream: str, now: datetime):
    from zoneinfo import ZoneInfo

    paris = datetime(2026, 3, 2, 15, tzinfo=ZoneInfo("Europe/Paris"))
    with store.writing() as conn:
        keep_readings(conn, stream, [episode("h", 1, at=paris)], now=now)
        assert (
            keep_readings(conn, stream, [episode("h", 1, at=paris.astimezone(UTC))], now=now).unchanged == 1
        )


def test_streams_do_not_mix(store: Store, stream: str, now: datetime):
    other = SeenStream("pier", "plays", "pier", "Pier", "house", "release")
    with store.writing() as conn:
        see_streams(conn, [other], now=now)
        keep_readings(conn, stream, [episode("a", 1)], now=now)
        keep_readings(conn, "pier", [episode("a", 2)], now=now)
        assert [one.count for one in newest_readings(conn, stream)] == [1]
        assert [one.count for one in newest_readings(conn, "pier")] == [2]


def test_the_head_moves_with_readings_and_epochs(store: Store, stream: str, now: datetime):
    with store.writing() as conn:
        assert head(conn, stream) == Head(0, 0)
        kept = keep_readings(conn, stream, [episode("a", 1), episode("b", 1)], now=now)
        assert head(conn, stream) == Head(kept.newest_id, 0)
        require_head(conn, stream, Head(kept.newest_id, 0))
        keep_readings(conn, stream, [episode("a", 1)], now=now)
        require_head(conn, stream, Head(kept.newest_id, 0))
        assert bump_epoch(conn, stream) == 1
    with store.writing() as conn, pytest.raises(HeadMoved) as caught:
        require_head(conn, stream, Head(kept.newest_id, 0))
    assert (caught.value.expected, caught.value.found) == (Head(kept.newest_id, 0), Head(kept.newest_id, 1))


def test_a_moved_head_takes_the_whole_record_back(store: Store, stream: str, now: datetime):
    with store.reading() as conn:
        seen = head(conn, stream)
    with store.writing() as conn:
        keep_readings(conn, stream, [episode("a", 1)], now=now)

    def record():
        with store.writing() as conn:
            keep_readings(conn, stream, [episode("z", 1)], now=now)
            require_head(conn, stream, seen)

    with pytest.raises(HeadMoved, match="Stream quay has moved on"):
        record()
    assert counts(store, stream, "z") == []


def test_the_bookkeeping_of_the_newest_agrees_with_the_readings(store: Store, stream: str, now: datetime):
    polls = st.lists(
        st.dictionaries(st.sampled_from("abcde"), st.none() | st.integers(0, 3), max_size=5), max_size=8
    )

    @settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
    @given(polls)
    def check(documents):
        with store.writing() as conn:
            for document in documents:
                kept = keep_readings(conn, stream, [episode(*row) for row in document.items()], now=now)
                found = {one.key: one for one in newest_readings(conn, stream)}
                assert {key: found[key].count for key in document} == document
                assert kept.stored + kept.unchanged + kept.held == len(document)
                assert kept.absent == len(found.keys() - document.keys())
                assert all(one == key_readings(conn, stream, key)[-1] for key, one in found.items())
                assert kept.newest_id == head(conn, stream).reading_id

    check()
