"""The store: one writer at a time, any number of readers that see a consistent picture."""

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from threading import local
from types import TracebackType

from sqlalchemy import Connection, Engine, make_url
from sqlalchemy.exc import ArgumentError, DBAPIError, StatementError
from sqlalchemy.exc import TimeoutError as PoolTimeout

from storage import sqlite
from storage.errors import NestedWriting, StoreBusy, StoreError, StoreMissing, UnsupportedAddress

WAIT_SECONDS = 30.0


class Store:
    """An open database. May be used from any thread; close it, or use it as a context manager."""

    def __init__(self, path: Path, *, wait_seconds: float) -> None:
        self._path, self._wait_seconds = path, wait_seconds
        self._writer = sqlite.writing_engine(path, wait_seconds=wait_seconds)
        self._readers = sqlite.reading_engine(path, wait_seconds=wait_seconds)
        self._mine = local()

    @property
    def place(self) -> str:
        """Where the database lies, in a form that may be shown."""
        return str(self._path)

    @property
    def engine(self) -> Engine:
        """The engine that writes."""
        return self._writer

    @contextmanager
    def writing(self) -> Iterator[Connection]:
        """The one write transaction: any exception takes it back. Compute before it, not inside."""
        with self._explaining(), self._one_a_thread(), self._writer.begin() as connection:
            yield connection

    @contextmanager
    def reading(self) -> Iterator[Connection]:
        """A read-only transaction that sees the store as it was when it began."""
        with self._explaining(), self._readers.begin() as connection:
            yield connection

    @contextmanager
    def migrating(self) -> Iterator[Connection]:
        """A write transaction with foreign keys off, for `storage.migrate` only."""
        engine = sqlite.migrating_engine(self._path, wait_seconds=self._wait_seconds)
        try:
            with self._explaining(), self._one_a_thread(), engine.begin() as connection:
                yield connection
        finally:
            engine.dispose()

    def close(self) -> None:
        """Closes all connections; the last one to close folds the write-ahead log into the file."""
        self._readers.dispose()
        self._writer.dispose()

    def __enter__(self) -> "Store":
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    @contextmanager
    def _one_a_thread(self) -> Iterator[None]:
        # A second write transaction in one thread would wait for the first until its time is up.
        if getattr(self._mine, "writing", False):
            raise NestedWriting
        self._mine.writing = True
        try:
            yield
        finally:
            self._mine.writing = False

    @contextmanager
    def _explaining(self) -> Iterator[None]:
        try:
            yield
        except PoolTimeout as error:
            raise StoreBusy(self.place, self._wait_seconds) from error
        except DBAPIError as error:
            ours = sqlite.explained(error.orig, self.place, self._wait_seconds)
            if ours is None:
                raise
            raise ours from error
        except StatementError as error:
            # An error of our column types, which SQLAlchemy has wrapped.
            if not isinstance(error.orig, StoreError):
                raise
            raise error.orig from None


def open_store(address: str, *, wait_seconds: float = WAIT_SECONDS) -> Store:
    """Opens the database at a path (or sqlite:/// address), creating the file but never its folder."""
    path = _path_of(address)
    sqlite.prepare_file(path, wait_seconds=wait_seconds)
    return Store(path, wait_seconds=wait_seconds)


def open_existing_store(address: str, *, wait_seconds: float = WAIT_SECONDS) -> Store:
    """Opens a database that is there already."""
    path = _path_of(address)
    if not path.exists():
        raise StoreMissing(str(path))
    return open_store(address, wait_seconds=wait_seconds)


def _path_of(address: str) -> Path:
    database = _database_of(address) if "://" in address else address
    if database in ("", ":memory:") or database.startswith("file:"):
        raise UnsupportedAddress("a database without a file", "what is kept there is lost at the end")
    return Path(database).absolute()


def _database_of(address: str) -> str:
    # Addresses may hold passwords: nothing but the kind is ever repeated.
    try:
        url = make_url(address)
    except ArgumentError:
        raise UnsupportedAddress(
            "an address that cannot be understood", "it is not of the form kind://..."
        ) from None
    if url.get_backend_name() != "sqlite":
        raise UnsupportedAddress(url.get_backend_name(), "this version keeps its data in SQLite")
    return url.database or ""
