"""What is peculiar to SQLite: its settings for each connection, and what its error codes mean."""

import sqlite3
from contextlib import closing
from pathlib import Path
from time import sleep
from typing import Any

from sqlalchemy import URL, Connection, Engine, create_engine, event
from sqlalchemy.pool import ConnectionPoolEntry, QueuePool

from storage.errors import ForeignDatabase, StoreBusy, StoreError, StoreUnusable

OLDEST_SQLITE = (3, 37, 0)
# "knkp": stands in the header of our files, so that another program's file is never taken for one of them.
APPLICATION_ID = 0x6B6E6B70
_READERS = 5
_READERS_AT_MOST = 15
_LARGEST_KEPT_LOG_BYTES = 64 * 2**20

_REMEDIES = {
    sqlite3.SQLITE_FULL: ("the disk is full", "Nothing was written; make room and try again."),
    sqlite3.SQLITE_IOERR: ("the disk reports an error", "Nothing was written; look after the disk."),
    sqlite3.SQLITE_READONLY: ("it is open for reading only", "Nothing was written; check who owns the file."),
    sqlite3.SQLITE_CORRUPT: (
        "it is damaged",
        "Restore a copy, or move it away and let the sources be read afresh.",
    ),
    sqlite3.SQLITE_NOTADB: ("it is not a SQLite database", "Give the path to a file of its own."),
    sqlite3.SQLITE_CANTOPEN: (
        "the file cannot be opened",
        "Check the path and who may read and write there.",
    ),
    sqlite3.SQLITE_PERM: ("access is denied", "Check who may read and write there."),
    sqlite3.SQLITE_AUTH: ("access is denied", "Check who may read and write there."),
}
_TRIES = 200
_BUSY = (sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED)


def writing_engine(path: Path, *, wait_seconds: float) -> Engine:
    """One connection: writers of this process queue for it, writers of other processes for the file."""
    engine = _engine(path, wait_seconds, at_most=1, kept=1)
    _on_connect(engine, _pragmas(wait_seconds) | {"foreign_keys": "ON"})
    _on_begin(engine, "BEGIN IMMEDIATE")
    return engine


def reading_engine(path: Path, *, wait_seconds: float) -> Engine:
    """Connections that cannot write; each transaction sees the store as it was when the transaction began."""
    engine = _engine(path, wait_seconds, at_most=_READERS_AT_MOST, kept=_READERS)
    _on_connect(engine, _pragmas(wait_seconds) | {"foreign_keys": "ON", "query_only": "ON"})
    # A deferred transaction takes its snapshot with its first look at the file, so look at once.
    _on_begin(engine, "BEGIN", "SELECT 1 FROM sqlite_master LIMIT 1")
    return engine


def migrating_engine(path: Path, *, wait_seconds: float) -> Engine:
    """Writes without foreign keys: to rebuild a parent table with them on deletes the child rows."""
    engine = _engine(path, wait_seconds, at_most=1, kept=1)
    _on_connect(engine, _pragmas(wait_seconds) | {"foreign_keys": "OFF"})
    _on_begin(engine, "BEGIN IMMEDIATE")
    return engine


def prepare_file(path: Path, *, wait_seconds: float) -> None:
    """Refuses what is not ours before anything is changed; then switches the file to write-ahead logging."""
    _check_library(path)
    _check_place(path)
    try:
        with closing(sqlite3.connect(path, timeout=wait_seconds, isolation_level=None)) as connection:
            _check_owner(connection, path)
            mode = _write_ahead(connection, wait_seconds)
    except sqlite3.Error as error:
        ours = explained(error, str(path), wait_seconds)
        if ours is None:
            raise
        raise ours from error
    if mode != "wal":
        raise StoreUnusable(
            str(path), "its file system has no write-ahead logging", "Put it on a local disk."
        )


def explained(error: BaseException | None, place: str, wait_seconds: float) -> StoreError | None:
    """Our own error for an error of the driver, if it is one that a person can act on."""
    code = getattr(error, "sqlite_errorcode", None)
    if code is None:
        return None
    primary = code & 0xFF
    if primary in _BUSY:
        return StoreBusy(place, wait_seconds)
    return StoreUnusable(place, *_REMEDIES[primary]) if primary in _REMEDIES else None


def _engine(path: Path, wait_seconds: float, *, at_most: int, kept: int) -> Engine:
    return create_engine(
        URL.create("sqlite", database=str(path)),
        poolclass=QueuePool,
        pool_size=kept,
        max_overflow=at_most - kept,
        pool_timeout=wait_seconds,
        hide_parameters=True,
        connect_args={"timeout": wait_seconds, "check_same_thread": False},
    )


def _pragmas(wait_seconds: float) -> dict[str, str]:
    return {
        "busy_timeout": str(round(wait_seconds * 1000)),
        "synchronous": "FULL",
        "journal_size_limit": str(_LARGEST_KEPT_LOG_BYTES),
    }


def _on_connect(engine: Engine, pragmas: dict[str, str]) -> None:
    def prepare(connection: sqlite3.Connection, entry: ConnectionPoolEntry) -> None:  # noqa: ARG001
        connection.isolation_level = None  # the driver must not begin transactions of its own
        for name, value in pragmas.items():
            connection.execute(f"PRAGMA {name} = {value}").close()

    event.listen(engine, "connect", prepare)


def _on_begin(engine: Engine, *statements: str) -> None:
    def begin(connection: Connection) -> None:
        for statement in statements:
            connection.exec_driver_sql(statement).close()

    event.listen(engine, "begin", begin)


def _check_library(path: Path) -> None:
    if sqlite3.sqlite_version_info < OLDEST_SQLITE:
        needed = ".".join(map(str, OLDEST_SQLITE))
        why = f"this Python brings SQLite {sqlite3.sqlite_version}"
        raise StoreUnusable(str(path), why, f"Use a Python with SQLite {needed} or newer.")


def _check_place(path: Path) -> None:
    if not path.parent.is_dir():
        raise StoreUnusable(
            str(path), f"its folder {path.parent} does not exist", "Create the folder, or correct the path."
        )
    if path.is_dir():
        raise StoreUnusable(str(path), "it is a folder", "Give the path to a file.")


def _check_owner(connection: sqlite3.Connection, path: Path) -> None:
    tables = _column(connection, "SELECT name FROM sqlite_master WHERE type = 'table' ORDER BY name")
    (owner,) = _column(connection, "PRAGMA application_id")
    if tables and owner != APPLICATION_ID:
        raise ForeignDatabase(str(path), tuple(tables))


def _write_ahead(connection: sqlite3.Connection, wait_seconds: float) -> Any:
    # SQLite does not wait for its lock here: two programs that open a new file at once would fail.
    for _ in range(_TRIES):
        try:
            return _switch(connection)
        except sqlite3.OperationalError as error:
            if error.sqlite_errorcode & 0xFF not in _BUSY:
                raise
        sleep(wait_seconds / _TRIES)
    return _switch(connection)


def _switch(connection: sqlite3.Connection) -> Any:
    (mode,) = _column(connection, "PRAGMA journal_mode = WAL")
    return mode


def _column(connection: sqlite3.Connection, statement: str) -> list[Any]:
    return [row[0] for row in connection.execute(statement)]
