"""Posteriors: one current row for a place; what a re-fold supersedes stays as evidence."""

from dataclasses import replace
from datetime import UTC, date, datetime, timedelta

import numpy as np
import pytest
from sqlalchemy.exc import IntegrityError

from detectors.posterior import Posterior, Quantiles, RunLengths, Weighted
from storage.engine import Store
from storage.errors import DamagedHistory, UnstorableValue
from storage.posteriors import (
    NewPosterior,
    as_posterior,
    evidence,
    history,
    newest_posterior,
    newest_posteriors,
    prune_superseded,
    supersede_from,
    write_posteriors,
)
from storage.readings import NewReading, keep_readings
from storage.streams import SeenStream, see_streams

POSTERIOR = Posterior(
    position=20,
    counted=12,
    run_lengths=RunLengths((1, 2, 5), (1, 4, 12), (0.125, 0.25, 0.625), True),
    run_length_mode=5,
    recent_shift=0.375,
    level=Quantiles(900.1, 1000.2, 1100.3),
    dispersion=Weighted((3.0, 6.0), (0.5, 0.5)),
    wander=Weighted((0.0, 0.1), (0.75, 0.25)),
    one_off=0.001,
    log_predictive=-7.25,
    pit=(0.25, 0.26),
)


def new(place: int, posterior: Posterior = POSTERIOR, **more) -> NewPosterior:
    day = date(2026, 3, 1) + timedelta(days=place)
    given = {"key": day.isoformat(), "at": day, "count": 100 + place, "fingerprint": "f", "reading_id": None}
    return NewPosterior(place=place, posterior=posterior, **given | more)


def places(rows) -> list[int]:
    return [row.place for row in rows]


def test_what_was_written_is_read(store: Store, stream: str, now: datetime):
    with store.writing() as conn:
        kept = keep_readings(conn, stream, [NewReading("2026-03-01", date(2026, 3, 1), 100)], now=now)
        write_posteriors(conn, stream, [new(0, reading_id=kept.newest_id)], now=now)
    with store.reading() as conn:
        (row,) = history(conn, stream)
    assert as_posterior(row) == POSTERIOR
    assert (row.key, row.at, row.count, row.reading_id) == (
        "2026-03-01",
        date(2026, 3, 1),
        100,
        kept.newest_id,
    )
    assert (row.written_utc, row.superseded_utc, row.fingerprint) == (now, None, "f")


def test_numbers_leave_numpy(store: Store, stream: str, now: datetime):
    odd = replace(
        POSTERIOR,
        position=np.int64(20),
        run_length_mode=np.int64(5),
        recent_shift=np.float64(0.375),
        level=Quantiles(*np.array([1.0, 2.0, 3.0])),
    )
    with store.writing() as conn:
        write_posteriors(conn, stream, [new(0, odd)], now=now)
        row = newest_posterior(conn, stream)
    assert (type(row.position), type(row.recent_shift), type(row.level.low)) == (int, float, float)


def test_nan_is_refused_rather_than_stored_as_nothing(store: Store, stream: str, now: datetime):
    rows = [new(0), new(1, replace(POSTERIOR, log_predictive=float("nan")))]
    with pytest.raises(UnstorableValue, match="finite number"), store.writing() as conn:
        write_posteriors(conn, stream, rows, now=now)
    with store.reading() as conn:
        assert history(conn, stream) == ()


def test_history_by_date_and_limit(store: Store, stream: str, now: datetime):
    with store.writing() as conn:
        write_posteriors(conn, stream, [new(place) for place in range(10) if place != 4], now=now)
        write_posteriors(conn, stream, [], now=now)
        assert places(history(conn, stream)) == [0, 1, 2, 3, 5, 6, 7, 8, 9]
        assert places(history(conn, stream, since=date(2026, 3, 4), until=date(2026, 3, 8))) == [3, 5, 6]
        assert places(history(conn, stream, limit=2)) == [8, 9]
        assert places(history(conn, stream, until=date(2026, 3, 4), limit=2)) == [1, 2]
        noon = datetime(2026, 3, 4, 12, tzinfo=UTC)
        assert places(history(conn, stream, since=noon, limit=1)) == [9]
        assert places(history(conn, stream, since=noon))[0] == 5


def test_a_place_has_one_current_row(store: Store, stream: str, now: datetime):
    with store.writing() as conn:
        write_posteriors(conn, stream, [new(0), new(1)], now=now)
    with pytest.raises(IntegrityError, match="UNIQUE"), store.writing() as conn:
        write_posteriors(conn, stream, [new(1), new(2)], now=now)
    with store.reading() as conn:
        assert places(history(conn, stream)) == [0, 1]


def test_a_refold_supersedes_and_keeps(store: Store, stream: str, now: datetime):
    later = now + timedelta(days=1)
    with store.writing() as conn:
        write_posteriors(conn, stream, [new(place) for place in range(5)], now=now)
    with store.writing() as conn:
        assert supersede_from(conn, stream, 3, now=later) == 2
        write_posteriors(conn, stream, [new(3, fingerprint="g")], now=later)
    with store.writing() as conn:
        assert places(history(conn, stream)) == [0, 1, 2, 3]
        current, old = evidence(conn, stream, 3)
        assert (current.fingerprint, current.superseded_utc) == ("g", None)
        assert (old.fingerprint, old.written_utc, old.superseded_utc) == ("f", now, later)
        assert as_posterior(old) == POSTERIOR
        (gone,) = evidence(conn, stream, 4)
        assert gone.superseded_utc == later
        assert supersede_from(conn, stream, 3, now=later + timedelta(days=1)) == 1
        assert old == evidence(conn, stream, 3)[1]


def test_old_evidence_is_pruned_and_nothing_else(store: Store, stream: str, now: datetime):
    with store.writing() as conn:
        for day in range(3):
            supersede_from(conn, stream, 0, now=now + timedelta(days=day))
            write_posteriors(conn, stream, [new(0)], now=now + timedelta(days=day))
        assert len(evidence(conn, stream, 0)) == 3
        assert prune_superseded(conn, before=now + timedelta(days=2)) == 1
        assert len(evidence(conn, stream, 0)) == 2
        assert places(history(conn, stream)) == [0]


def test_the_newest_of_one_and_of_all(store: Store, stream: str, now: datetime):
    with store.writing() as conn:
        see_streams(conn, [SeenStream("pier", "plays", "pier", "Pier", "house", "release")], now=now)
        assert newest_posterior(conn, stream) is None
        write_posteriors(conn, stream, [new(0), new(7)], now=now)
        write_posteriors(conn, "pier", [new(2), new(3)], now=now)
        supersede_from(conn, "pier", 3, now=now)
        assert newest_posterior(conn, stream).place == 7
        assert {id: row.place for id, row in newest_posteriors(conn).items()} == {"quay": 7, "pier": 2}


def test_damaged_bytes_say_so_and_spare_the_figures(store: Store, stream: str, now: datetime):
    with store.writing() as conn:
        write_posteriors(conn, stream, [new(0)], now=now)
        conn.exec_driver_sql("UPDATE posteriors SET history = x'0102'")
        row = newest_posterior(conn, stream)
    assert row.recent_shift == 0.375
    with pytest.raises(DamagedHistory, match="Rebuild the stream"):
        as_posterior(row)
