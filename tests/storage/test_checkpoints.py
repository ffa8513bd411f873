"""Checkpoints: few stay, spread so that a correction far back need not fold from the start."""

from datetime import datetime

import pytest
from hypothesis import given
from hypothesis import strategies as st

from storage.checkpoints import (
    KEPT_AT_MOST,
    checkpoint_bytes,
    drop_checkpoints,
    keep_checkpoint,
    list_checkpoints,
    worth_keeping,
)
from storage.engine import Store
from storage.errors import NoSuchRow


def keep(
    store: Store, stream: str, folded: int, now: datetime, *, resumed_from=None, fingerprint="f"
) -> None:
    start = folded - 1 if resumed_from is None else resumed_from
    with store.writing() as conn:
        keep_checkpoint(
            conn,
            stream,
            folded=folded,
            resumed_from=start,
            digest=f"d{folded}",
            fingerprint=fingerprint,
            body=b"checkpoint %d" % folded,
            now=now,
        )


def stored(store: Store, stream: str, fingerprint: str = "f") -> list[int]:
    with store.reading() as conn:
        return [mark.folded for mark in list_checkpoints(conn, stream, fingerprint=fingerprint)]


def test_the_newest_comes_first_with_its_bytes(store: Store, stream: str, now: datetime):
    for folded in (10, 14):
        keep(store, stream, folded, now)
    with store.reading() as conn:
        newest, before = list_checkpoints(conn, stream, fingerprint="f")
        assert (newest.folded, newest.digest, newest.written_utc) == (14, "d14", now)
        assert checkpoint_bytes(conn, newest.id) == b"checkpoint 14"
        assert checkpoint_bytes(conn, before.id) == b"checkpoint 10"
        with pytest.raises(NoSuchRow, match="no checkpoint with the id 999"):
            checkpoint_bytes(conn, 999)


def test_a_refold_voids_what_lies_beyond_its_start(store: Store, stream: str, now: datetime):
    for folded in (10, 30, 34, 35):
        keep(store, stream, folded, now)
    keep(store, stream, 36, now, resumed_from=30)
    assert stored(store, stream) == [36, 30, 10]
    keep(store, stream, 36, now, resumed_from=0)
    assert stored(store, stream) == [36]


def test_a_shorter_stream_voids_the_longer_checkpoint(store: Store, stream: str, now: datetime):
    keep(store, stream, 30, now)
    keep(store, stream, 28, now, resumed_from=28)
    assert stored(store, stream) == [28]


def test_another_fingerprint_voids_all(store: Store, stream: str, now: datetime):
    keep(store, stream, 10, now)
    keep(store, stream, 11, now, fingerprint="g")
    assert stored(store, stream) == []
    assert stored(store, stream, "g") == [11]


def test_a_rebuild_begins_with_none(store: Store, stream: str, now: datetime):
    keep(store, stream, 10, now)
    with store.writing() as conn:
        assert drop_checkpoints(conn, stream) == 1
    assert stored(store, stream) == []


def test_a_long_life_keeps_few_and_near(store: Store, stream: str, now: datetime):
    for folded in range(1, 300):
        keep(store, stream, folded, now)
    found = stored(store, stream)
    assert len(found) == KEPT_AT_MOST
    assert 299 - found[-1] >= 256


def test_whatever_the_depth_of_a_correction_little_is_folded_again():
    kept: tuple[int, ...] = ()
    worst = 0.0
    for folded in range(1, 3000):
        kept = worth_keeping((*kept, folded))
        if folded > 1000:
            for depth in (1, 2, 5, 20, 50, 200, 250):
                start = max((one for one in kept if one <= folded - depth), default=0)
                worst = max(worst, (folded - start) / depth)
    # No more than sixteen times as far back as the correction lies.
    assert worst <= 16.0


@given(st.sets(st.integers(1, 2000), min_size=1, max_size=60))
def test_any_set_is_thinned_to_few_that_stay_when_thinned_again(folded: set[int]):
    kept = worth_keeping(tuple(folded))
    assert len(set(kept)) == len(kept) <= KEPT_AT_MOST
    assert set(kept) <= folded
    assert max(folded) == kept[0]
    assert set(worth_keeping(kept)) == set(kept)
