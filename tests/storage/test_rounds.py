"""Rounds say what they did, crashes included; what they kept out is shown within bounds."""

from datetime import datetime, timedelta

import pytest

from storage import rounds
from storage.engine import Store
from storage.errors import NoSuchRow
from storage.rounds import (
    KeptOutRow,
    RoundCounts,
    begin_round,
    break_off_unfinished,
    end_round,
    get_round,
    last_good_round,
    last_good_rounds,
    list_rounds,
    note_counts,
)
from storage.validators import Validators, find_validators, forget_validators, keep_validators

ODD = KeptOutRow(row=3, why="its count is below 0", text='{"count": -1}')


def full_round(store: Store, source: str, outcome: str, now: datetime, kept_out=()) -> int:
    with store.writing() as conn:
        id = begin_round(conn, source, now=now)
    with store.writing() as conn:
        note_counts(conn, id, RoundCounts(5, 2, 3, 1, held=1, kept_out=tuple(kept_out)))
        end_round(conn, id, outcome, now=now + timedelta(seconds=9), message="said \x00 so")
    return id


def test_a_round_from_begin_to_end(store: Store, now: datetime):
    with store.writing() as conn:
        id = begin_round(conn, "plays", now=now)
        opened = get_round(conn, id)
    assert (opened.outcome, opened.ended_utc, opened.rows_used, opened.kept_out) == ("under way", None, 0, ())
    id = full_round(store, "plays", rounds.GOOD, now, [ODD])
    with store.reading() as conn:
        done = get_round(conn, id)
    assert (done.outcome, done.ended_utc) == ("good", now + timedelta(seconds=9))
    assert (done.rows_used, done.stored, done.unchanged, done.absent, done.held) == (5, 2, 3, 1, 1)
    assert (done.kept_out_count, done.kept_out, done.message) == (1, (ODD,), "said \ufffd so")


def test_an_outcome_is_one_of_our_words(store: Store, now: datetime):
    with pytest.raises(Exception, match="ck_rounds_outcome"):
        full_round(store, "plays", "splendid", now)


def test_what_was_kept_out_is_bounded_but_counted(store: Store, now: datetime):
    rows = [KeptOutRow(number, "w" * 1000, "t" * 10_000) for number in range(250)]
    id = full_round(store, "plays", rounds.GOOD, now, rows)
    with store.writing() as conn:
        found = get_round(conn, id)
        note_counts(conn, id, RoundCounts(0, 0, 0, 0, kept_out=(ODD,), kept_out_count=7000))
        counted = get_round(conn, id)
    assert (found.kept_out_count, len(found.kept_out)) == (250, rounds.KEPT_OUT_AT_MOST)
    assert len(found.kept_out[0].why) == len(found.kept_out[0].text) == 300
    assert (counted.kept_out_count, counted.kept_out) == (7000, (ODD,))


def test_detail_of_old_rounds_is_forgotten_source_by_source(store: Store, now: datetime, monkeypatch):
    monkeypatch.setattr(rounds, "ROUNDS_WITH_DETAIL", 3)
    other = full_round(store, "mail", rounds.GOOD, now, [ODD])
    ids = [full_round(store, "plays", rounds.GOOD, now, [ODD]) for _ in range(6)]
    with store.reading() as conn:
        found = [get_round(conn, id) for id in ids]
        assert get_round(conn, other).kept_out == (ODD,)
    assert [len(one.kept_out) for one in found] == [0, 0, 0, 1, 1, 1]
    assert [one.kept_out_count for one in found] == [1] * 6


def test_a_crash_is_noted_at_the_next_start(store: Store, now: datetime):
    done = full_round(store, "plays", rounds.GOOD, now)
    with store.writing() as conn:
        lost, elsewhere = begin_round(conn, "plays", now=now), begin_round(conn, "mail", now=now)
    with store.writing() as conn:
        assert break_off_unfinished(conn, now=now, source="mail") == 1
        assert break_off_unfinished(conn, now=now) == 1
        assert break_off_unfinished(conn, now=now) == 0
        outcomes = [get_round(conn, id).outcome for id in (done, lost, elsewhere)]
        assert outcomes == ["good", "broken off", "broken off"]
        assert "ended while this round was under way" in get_round(conn, lost).message


def test_the_last_good_round_of_each_source(store: Store, now: datetime):
    full_round(store, "plays", rounds.GOOD, now)
    nothing = full_round(store, "plays", rounds.NOTHING_NEW, now)
    full_round(store, "plays", rounds.FAILED, now)
    full_round(store, "mail", rounds.FAILED, now)
    good = full_round(store, "video", rounds.GOOD, now)
    with store.reading() as conn:
        found = last_good_rounds(conn)
        assert {source: one.id for source, one in found.items()} == {"plays": nothing, "video": good}
        assert last_good_round(conn, "plays") == found["plays"]
        assert last_good_round(conn, "mail") is None


def test_lists_newest_first_within_a_limit(store: Store, now: datetime):
    ids = [full_round(store, source, rounds.GOOD, now) for source in ("plays", "mail", "plays")]
    with store.reading() as conn:
        assert [one.id for one in list_rounds(conn)] == ids[::-1]
        assert [one.id for one in list_rounds(conn, source="plays", limit=1)] == [ids[2]]


def test_an_unknown_round(store: Store, now: datetime):
    with store.writing() as conn:
        with pytest.raises(NoSuchRow, match="no round with the id 99"):
            get_round(conn, 99)
        with pytest.raises(NoSuchRow, match="99"):
            end_round(conn, 99, rounds.GOOD, now=now)


def test_validators_hold_for_what_they_are_about(store: Store, now: datetime):
    with store.writing() as conn:
        keep_validators(conn, "plays", Validators('"abc"', None, "d1"), now=now)
        keep_validators(conn, "plays", Validators('"def"', "Mon, 02 Mar 2026 14:00:00 GMT", "d1"), now=now)
        assert find_validators(conn, "plays", about="d1").etag == '"def"'
        assert find_validators(conn, "plays", about="d2") is None
        assert find_validators(conn, "mail", about="d1") is None
        forget_validators(conn, "plays")
        assert find_validators(conn, "plays", about="d1") is None
