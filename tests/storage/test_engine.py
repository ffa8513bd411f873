"""The engine: pragmas, one writer, snapshots, and clear sentences for what cannot be opened."""

import sqlite3
import subprocess
import sys
import threading
from pathlib import Path

import pytest
from sqlalchemy import text

from storage import migrate
from storage.engine import Store, open_existing_store, open_store
from storage.errors import (
    ForeignDatabase,
    NestedWriting,
    StoreBusy,
    StoreMissing,
    StoreUnusable,
    UnsupportedAddress,
)
from storage.streams import find_stream, hush_stream, list_streams


def pragmas(conn, *names):
    return {name: conn.exec_driver_sql(f"PRAGMA {name}").scalar() for name in names}


def test_every_connection_has_its_pragmas(store: Store):
    names = ("journal_mode", "foreign_keys", "busy_timeout", "synchronous", "query_only")
    expected = {"journal_mode": "wal", "foreign_keys": 1, "busy_timeout": 5000, "synchronous": 2}
    with store.writing() as conn:
        assert pragmas(conn, *names) == expected | {"query_only": 0}
    with store.reading() as first, store.reading() as second:
        for conn in (first, second):
            assert pragmas(conn, *names) == expected | {"query_only": 1}


def test_migrating_has_foreign_keys_off_and_only_there(store: Store):
    with store.migrating() as conn:
        assert pragmas(conn, "foreign_keys") == {"foreign_keys": 0}
    with store.writing() as conn:
        assert pragmas(conn, "foreign_keys") == {"foreign_keys": 1}


def test_reading_cannot_write(store: Store, stream: str):
    with pytest.raises(StoreUnusable, match="open for reading only"), store.reading() as conn:
        hush_stream(conn, stream, None)


def test_what_raises_leaves_nothing(store: Store, stream: str, now):
    def write_and_fail():
        with store.writing() as conn:
            hush_stream(conn, stream, now)
            raise RuntimeError("half way")

    with pytest.raises(RuntimeError, match="half way"):
        write_and_fail()
    with store.reading() as conn:
        assert find_stream(conn, stream).hushed_until_utc is None


def test_reading_sees_one_moment(store: Store, stream: str, now):
    with store.reading() as conn:
        # The snapshot is that of the beginning of the transaction, not of the first question.
        with store.writing() as writer:
            hush_stream(writer, stream, now)
        assert find_stream(conn, stream).hushed_until_utc is None
    with store.reading() as conn:
        assert find_stream(conn, stream).hushed_until_utc == now


def test_a_second_write_in_the_same_thread_is_refused_at_once(store: Store):
    with store.writing(), pytest.raises(NestedWriting), store.writing():
        pass
    with store.writing():
        pass


def test_foreign_keys_are_enforced(store: Store):
    with pytest.raises(Exception, match="FOREIGN KEY"), store.writing() as conn:
        conn.execute(text("INSERT INTO newest VALUES ('nowhere', 'k', 7)"))


def add_ones(store: Store, times: int) -> None:
    for _ in range(times):
        with store.writing() as conn:
            (value,) = conn.execute(text("SELECT epoch FROM streams")).one()
            conn.execute(text("UPDATE streams SET epoch = :value"), {"value": value + 1})


def test_threads_write_without_losing_or_locking(store: Store, stream: str):
    failures = []

    def work():
        try:
            add_ones(store, 25)
        except Exception as error:
            failures.append(error)

    threads = [threading.Thread(target=work) for _ in range(6)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join(timeout=60)
    assert failures == []
    with store.reading() as conn:
        assert find_stream(conn, stream).epoch == 150


PROCESS = """
import sys
from sqlalchemy import text
from storage.engine import open_store
with open_store(sys.argv[1]) as store:
    for _ in range(25):
        with store.writing() as conn:
            (value,) = conn.execute(text("SELECT epoch FROM streams")).one()
            conn.execute(text("UPDATE streams SET epoch = :value"), {"value": value + 1})
"""


def test_processes_write_without_losing_or_locking(store: Store, place: str, stream: str):
    root = Path(__file__).parents[2]
    others = [
        subprocess.Popen([sys.executable, "-c", PROCESS, place], cwd=root, stderr=subprocess.PIPE)
        for _ in range(2)
    ]
    add_ones(store, 25)
    for other in others:
        _, errors = other.communicate(timeout=60)
        assert (other.returncode, errors) == (0, b"")
    with store.reading() as conn:
        assert find_stream(conn, stream).epoch == 75


def test_a_writer_that_waits_too_long_is_told_so(store: Store, place: str):
    with open_store(place, wait_seconds=0.05) as hasty, store.writing():
        with pytest.raises(StoreBusy, match=r"over 0\.05 seconds"), hasty.writing():
            pass
        with hasty.reading() as conn:
            assert list_streams(conn) == ()
    with open_store(place, wait_seconds=0.05) as hasty, hasty.writing():
        pass


def test_a_thread_that_waits_too_long_is_told_so(place: str):
    with open_store(place, wait_seconds=0.05) as store, store.writing():
        caught = []

        def work():
            try:
                with store.writing():
                    pass
            except StoreBusy as error:
                caught.append(error)

        thread = threading.Thread(target=work)
        thread.start()
        thread.join(timeout=10)
        assert len(caught) == 1


def test_a_missing_folder_is_named_and_not_made(tmp_path: Path):
    with pytest.raises(StoreUnusable, match=r"nowhere does not exist\. Create the folder"):
        open_store(str(tmp_path / "nowhere" / "store.sqlite"))
    assert not (tmp_path / "nowhere").exists()


def test_a_folder_is_no_database(tmp_path: Path):
    with pytest.raises(StoreUnusable, match="it is a folder"):
        open_store(str(tmp_path))


def test_looking_does_not_create(tmp_path: Path):
    with pytest.raises(StoreMissing, match="no database at"):
        open_existing_store(str(tmp_path / "store.sqlite"))
    assert list(tmp_path.iterdir()) == []


def test_looking_at_what_is_there(place: str):
    with open_existing_store(place) as store:
        assert migrate.current_version(store) == migrate.newest_version()


def test_a_file_that_is_no_database(tmp_path: Path):
    path = tmp_path / "notes.txt"
    path.write_text("Dear diary, " * 500)
    with pytest.raises(StoreUnusable, match="not a SQLite database"):
        open_store(str(path))
    assert path.read_text() == "Dear diary, " * 500


def test_a_database_of_another_program_is_left_alone(tmp_path: Path):
    path = tmp_path / "other.sqlite"
    with sqlite3.connect(path) as connection:
        connection.execute("CREATE TABLE recipes (name TEXT)")
    connection.close()
    before = path.read_bytes()
    with pytest.raises(ForeignDatabase, match=r"not ours \(recipes\)"):
        open_store(str(path))
    assert path.read_bytes() == before


def test_a_cut_off_file_is_called_damaged(place: str):
    path = Path(place)
    path.write_bytes(path.read_bytes()[:9000])
    with pytest.raises(StoreUnusable, match="damaged"), open_store(place) as store, store.reading() as conn:
        list_streams(conn)


@pytest.mark.parametrize(
    ("address", "words"),
    [
        ("postgresql://ann:hunter2@db/knick", "postgresql"),
        ("://ann:hunter2@db", "cannot be understood"),
        (":memory:", "without a file"),
        ("sqlite://", "without a file"),
        ("sqlite:///file:x?mode=memory&uri=true", "without a file"),
        ("", "without a file"),
    ],
)
def test_other_addresses_are_refused_without_repeating_secrets(address: str, words: str):
    with pytest.raises(UnsupportedAddress, match=words) as caught:
        open_store(address)
    assert "hunter2" not in str(caught.value)
    assert caught.value.__cause__ is None


def test_an_address_in_url_form(tmp_path: Path):
    with open_store(f"sqlite:///{tmp_path / 'store.sqlite'}") as store:
        migrate.upgrade(store)
        assert store.place == str(tmp_path / "store.sqlite")


def test_a_path_with_odd_signs(tmp_path: Path):
    folder = tmp_path / "50 % ?#ü"
    folder.mkdir()
    with open_store(str(folder / "a?b.sqlite")) as store:
        migrate.upgrade(store)
    assert (folder / "a?b.sqlite").exists()
