"""Streams are known from their first round on, renamed freely, and hushed by date."""

from dataclasses import replace
from datetime import datetime, timedelta

import pytest

from storage.engine import Store
from storage.errors import NoSuchRow
from storage.streams import (
    SeenStream,
    bump_epoch,
    find_stream,
    get_stream,
    hush_stream,
    list_streams,
    see_streams,
    set_fingerprint,
)


def seen(id: str, **more: str) -> SeenStream:
    given = {"source": "plays", "split": id, "title": id.title(), "slate": "house", "shape": "release"} | more
    return SeenStream(id=id, **given)


def test_first_seen_stays_and_the_rest_follows_the_settings(store: Store, now: datetime):
    with store.writing() as conn:
        assert see_streams(conn, [seen("quay"), seen("pier")], now=now) == ("quay", "pier")
    later = now + timedelta(hours=1)
    with store.writing() as conn:
        set_fingerprint(conn, "quay", "f1")
        assert bump_epoch(conn, "quay") == 1
        renamed = [seen("quay", title="Quay Stories", slate="evening"), seen("mole")]
        assert see_streams(conn, renamed, now=later) == ("mole",)
    with store.reading() as conn:
        quay, pier = get_stream(conn, "quay"), get_stream(conn, "pier")
    assert (quay.title, quay.slate, quay.first_read_utc, quay.last_seen_utc) == (
        "Quay Stories",
        "evening",
        now,
        later,
    )
    assert (quay.epoch, quay.fingerprint) == (1, "f1")
    assert (pier.last_seen_utc, pier.epoch, pier.fingerprint) == (now, 0, None)


def test_a_stream_seen_twice_in_a_round_is_one(store: Store, now: datetime):
    with store.writing() as conn:
        assert see_streams(conn, [seen("quay"), replace(seen("quay"), title="Q")], now=now) == ("quay",)
        assert get_stream(conn, "quay").title == "Q"


def test_lists_are_by_title_and_filtered(store: Store, now: datetime):
    streams = [seen("b", title="A"), seen("a", title="B", slate="other"), seen("c", title="C", source="mail")]
    with store.writing() as conn:
        see_streams(conn, streams, now=now)
        assert [one.id for one in list_streams(conn)] == ["b", "a", "c"]
        assert [one.id for one in list_streams(conn, slate="house")] == ["b", "c"]
        assert [one.id for one in list_streams(conn, source="mail")] == ["c"]
        assert list_streams(conn, slate="house", source="nowhere") == ()


def test_hush_and_lift(store: Store, stream: str, now: datetime):
    with store.writing() as conn:
        hush_stream(conn, stream, now)
        assert get_stream(conn, stream).hushed_until_utc == now
        hush_stream(conn, stream, None)
        assert get_stream(conn, stream).hushed_until_utc is None


def test_an_unknown_stream(store: Store, now: datetime):
    with store.writing() as conn:
        assert find_stream(conn, "nobody") is None
        for act in (
            lambda: get_stream(conn, "nobody"),
            lambda: hush_stream(conn, "nobody", now),
            lambda: bump_epoch(conn, "nobody"),
            lambda: set_fingerprint(conn, "nobody", "f"),
        ):
            with pytest.raises(NoSuchRow, match="no stream with the id 'nobody'"):
                act()
