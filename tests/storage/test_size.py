"""What hourly polls leave behind, scaled down and reckoned up to 40 shows with 200 releases each."""

import sqlite3
from contextlib import closing
from datetime import UTC, date, datetime, timedelta
from pathlib import Path

import numpy as np

from detectors.posterior import Posterior, Quantiles, RunLengths, Weighted
from storage.engine import Store
from storage.posteriors import NewPosterior, write_posteriors
from storage.readings import NewReading, keep_readings
from storage.streams import SeenStream, see_streams

SHOWS, OLD, YOUNG, DAYS = 2, 30, 1, 8
START = datetime(2026, 3, 2, tzinfo=UTC)


def size_of(store: Store) -> int:
    # The log is folded into the file first, so that the file alone holds everything.
    with closing(sqlite3.connect(store.place)) as connection:
        connection.execute("PRAGMA wal_checkpoint(TRUNCATE)").fetchall()
    return Path(store.place).stat().st_size


def document(hour: int) -> list[NewReading]:
    # Every release gains counts every hour: the most that can change.
    old = [row(number, hour, final=True) for number in range(OLD)]
    return old + [row(OLD + number, hour, final=False) for number in range(YOUNG)]


def row(number: int, hour: int, *, final: bool) -> NewReading:
    day = date(2020, 1, 1) + timedelta(days=7 * number)
    title = f"Part {number}: a title of the usual length"
    return NewReading(f"episode-{number:06d}", day, 1000 + hour, title=title, final=final)


def test_a_year_of_hourly_polls_of_forty_shows_stays_below_a_gigabyte(store: Store):
    shows = [
        SeenStream(f"plays/show-{n}", "plays", f"{n}", f"Show {n}", "house", "release") for n in range(SHOWS)
    ]
    before, stored = size_of(store), 0
    for hour in range(24 * DAYS):
        now = START + timedelta(hours=hour)
        with store.writing() as conn:
            see_streams(conn, shows, now=now)
            stored += sum(keep_readings(conn, one.id, document(hour), now=now).stored for one in shows)
    # An old release leaves one reading a day, a young one one an hour.
    assert stored == SHOWS * DAYS * (OLD + 24 * YOUNG)
    bytes_each = (size_of(store) - before) / stored
    a_year = 40 * 365 * (200 + 24) * bytes_each
    print(f"{bytes_each:.0f} bytes a reading, at most {a_year / 1e9:.2f} GB a year")
    assert a_year < 0.8e9


def test_a_stored_posterior_with_all_its_columns_takes_little_over_a_kilobyte(store: Store, stream: str):
    random = np.random.default_rng(1)
    spans = np.concatenate([np.zeros(40, int), np.geomspace(1, 1500, 55).astype(int)])
    longest = np.cumsum(spans + 1)
    posterior = Posterior(
        position=20514,
        counted=600,
        run_lengths=RunLengths(
            tuple((longest - spans).tolist()),
            tuple(longest.tolist()),
            tuple(random.dirichlet(np.ones(95))),
            True,
        ),
        run_length_mode=5,
        recent_shift=0.375,
        level=Quantiles(900.1, 1000.2, 1100.3),
        dispersion=Weighted(tuple(2.0 ** np.arange(13)), tuple(random.dirichlet(np.ones(13)))),
        wander=Weighted(tuple(0.3 * np.arange(7) / 6), tuple(random.dirichlet(np.ones(7)))),
        one_off=0.001,
        log_predictive=-7.25,
        pit=(0.25, 0.26),
    )
    fingerprint = "f" * 64
    rows = [
        NewPosterior(place, f"episode-{place}", date(2026, 3, 2), place, posterior, fingerprint, None)
        for place in range(600)
    ]
    before = size_of(store)
    with store.writing() as conn:
        write_posteriors(conn, stream, rows, now=START)
    bytes_each = (size_of(store) - before) / len(rows)
    print(f"{bytes_each:.0f} bytes a posterior")
    assert bytes_each < 1400
