"""Brings a database to this program's tables, in one transaction."""

from dataclasses import dataclass
from pathlib import Path

from alembic import command
from alembic.config import Config
from alembic.runtime.migration import MigrationContext
from alembic.script import ScriptDirectory
from sqlalchemy import Connection

from storage.engine import Store
from storage.errors import MigrationBroken, SchemaTooNew, SchemaTooOld
from storage.sqlite import APPLICATION_ID

_MIGRATIONS = Path(__file__).parent / "migrations"


@dataclass(frozen=True, slots=True)
class Upgraded:
    """The version of the tables before (None: there were none) and after."""

    before: str | None
    after: str


def upgrade(store: Store) -> Upgraded:
    """Migrates to the newest version; on a database that has it already, does nothing."""
    newest = newest_version()
    with store.migrating() as connection:
        before = _version(connection)
        _refuse_newer(store, before, newest)
        if before != newest:
            _migrate(connection)
            _refuse_dangling(connection, store)
    return Upgraded(before, newest)


def current_version(store: Store) -> str | None:
    """The version of the tables in this database, None when there are none yet."""
    with store.reading() as connection:
        return _version(connection)


def newest_version() -> str:
    """The version of the tables that this program works with."""
    return str(_scripts().get_current_head())


def require_current(store: Store) -> None:
    """Raises when the tables are older or newer than this program's."""
    found, newest = current_version(store), newest_version()
    _refuse_newer(store, found, newest)
    if found != newest:
        raise SchemaTooOld(store.place, found, newest)


def _migrate(connection: Connection) -> None:
    config = _config()
    config.attributes["connection"] = connection
    command.upgrade(config, "head")
    connection.exec_driver_sql(f"PRAGMA application_id = {APPLICATION_ID}")


def _refuse_newer(store: Store, found: str | None, newest: str) -> None:
    known = {script.revision for script in _scripts().walk_revisions()}
    if found is not None and found not in known:
        raise SchemaTooNew(store.place, found, newest)


def _refuse_dangling(connection: Connection, store: Store) -> None:
    dangling = connection.exec_driver_sql("PRAGMA foreign_key_check").all()
    if dangling:
        raise MigrationBroken(store.place, tuple(sorted({str(row[0]) for row in dangling})))


def _version(connection: Connection) -> str | None:
    return MigrationContext.configure(connection).get_current_revision()


def _scripts() -> ScriptDirectory:
    return ScriptDirectory.from_config(_config())


def _config() -> Config:
    config = Config()
    # The option is read with interpolation, in which a percent sign of the path would stand for something.
    config.set_main_option("script_location", str(_MIGRATIONS).replace("%", "%%"))
    return config
