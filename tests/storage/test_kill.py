"""A process killed in the middle of a write transaction leaves the store as it was, and free."""

import subprocess
import sys
from datetime import date, datetime
from pathlib import Path

import pytest

from storage.engine import Store, open_store
from storage.errors import StoreUnusable
from storage.readings import NewReading, keep_readings, newest_readings
from storage.shifts import untold_shifts
from storage.streams import find_stream

# Writes, says so, and waits to be killed with the transaction open.
VICTIM = """
import sys
from datetime import UTC, date, datetime
from storage.engine import open_store
from storage.readings import NewReading, keep_readings
from storage.streams import bump_epoch, hush_stream
now = datetime(2026, 3, 2, tzinfo=UTC)
store = open_store(sys.argv[1])
with store.writing() as conn:
    hush_stream(conn, "quay", now)
with store.writing() as conn:
    bump_epoch(conn, "quay")
    rows = [NewReading(f"e{n}", date(2026, 3, 1), n, title="t" * 200) for n in range(20_000)]
    keep_readings(conn, "quay", rows, now=now)
    print("written", flush=True)
    sys.stdin.read()
"""


def test_kill_inside_a_write_transaction(store: Store, place: str, stream: str):
    store.close()
    root = Path(__file__).parents[2]
    victim = subprocess.Popen(
        [sys.executable, "-c", VICTIM, place], cwd=root, stdin=subprocess.PIPE, stdout=subprocess.PIPE
    )
    with victim:
        assert victim.stdout.readline() == b"written\n"
        victim.kill()
    with open_store(place, wait_seconds=5.0) as again:
        with again.reading() as conn:
            # What was committed before is there, what was under way is not.
            assert find_stream(conn, stream).hushed_until_utc is not None
            assert find_stream(conn, stream).epoch == 0
            assert newest_readings(conn, stream) == ()
            assert untold_shifts(conn) == ()
        with again.writing() as conn:
            assert conn.exec_driver_sql("PRAGMA integrity_check").scalar() == "ok"


def test_a_full_disk_leaves_nothing_half_stored(store: Store, stream: str, now: datetime):
    def fill():
        with store.writing() as conn:
            pages = conn.exec_driver_sql("PRAGMA page_count").scalar()
            # SQLite's own bound on the file stands in for the disk's.
            conn.exec_driver_sql(f"PRAGMA max_page_count = {pages + 5}").all()
            for day in range(50):
                rows = [NewReading(f"e{day}-{n}", date(2026, 3, 1), n, title="t" * 200) for n in range(200)]
                keep_readings(conn, stream, rows, now=now)

    with pytest.raises(StoreUnusable, match=r"the disk is full\. Nothing was written"):
        fill()
    with store.reading() as conn:
        assert newest_readings(conn, stream) == ()
