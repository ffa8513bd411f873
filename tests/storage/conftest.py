"""A store in a fresh file, and the smallest things to put into it."""

from collections.abc import Callable, Iterator
from datetime import UTC, datetime
from pathlib import Path

import pytest

from storage import migrate
from storage.engine import Store, open_store
from storage.streams import SeenStream, see_streams

NOW = datetime(2026, 3, 2, 14, 0, tzinfo=UTC)
QUAY = SeenStream(
    id="quay", source="plays", split="quay", title="Quay Stories", slate="house", shape="release"
)


@pytest.fixture
def now() -> datetime:
    return NOW


@pytest.fixture(scope="session")
def migrated_file(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    path = tmp_path_factory.mktemp("migrated") / "store.sqlite"
    with open_store(str(path)) as store:
        migrate.upgrade(store)
    return path.read_bytes()


@pytest.fixture
def place(tmp_path: Path, migrated_file: bytes) -> str:
    path = tmp_path / "store.sqlite"
    path.write_bytes(migrated_file)
    return str(path)


@pytest.fixture
def store(place: str) -> Iterator[Store]:
    with open_store(place, wait_seconds=5.0) as opened:
        yield opened


@pytest.fixture
def stream(store: Store) -> str:
    """A release stream with the id "quay"."""
    with store.writing() as conn:
        see_streams(conn, [QUAY], now=NOW)
    return "quay"


@pytest.fixture
def fresh_store(tmp_path: Path) -> Callable[[str], Store]:
    return lambda name: open_store(str(tmp_path / name), wait_seconds=2.0)
