"""Migrations lead from nothing to just the tables of this program, once, and not past them."""

import logging
import re
import sqlite3
import threading
from pathlib import Path

import pytest
from alembic.autogenerate import compare_metadata
from alembic.migration import MigrationContext
from sqlalchemy import create_engine, inspect, text

from storage import migrate
from storage.errors import MigrationBroken, SchemaTooNew, SchemaTooOld
from storage.tables import metadata


def schema(conn):
    rows = conn.exec_driver_sql("SELECT name, sql FROM sqlite_master WHERE tbl_name NOT LIKE 'alembic%'")
    # The order of constraints within a table is of no account.
    return {name: sorted(re.split(r", | \) (?=STRICT)", " ".join((sql or "").split()))) for name, sql in rows}


def test_from_empty_to_the_tables(fresh_store):
    with fresh_store("a.sqlite") as store:
        assert migrate.current_version(store) is None
        with pytest.raises(SchemaTooOld, match=r"no tables yet; this program needs"):
            migrate.require_current(store)
        newest = migrate.newest_version()
        assert migrate.upgrade(store) == migrate.Upgraded(None, newest)
        assert migrate.upgrade(store) == migrate.Upgraded(newest, newest)
        migrate.require_current(store)
        with store.reading() as conn:
            context = MigrationContext.configure(conn, opts={"compare_type": True})
            assert compare_metadata(context, metadata) == []


def test_the_tables_are_word_for_word_those_of_the_metadata(fresh_store):
    # Alembic compares neither CHECK constraints nor partial indexes nor STRICT; the text of the schema does.
    plain = create_engine("sqlite://")
    metadata.create_all(plain)
    with fresh_store("a.sqlite") as store, plain.connect() as made:
        migrate.upgrade(store)
        with store.reading() as migrated:
            assert schema(migrated) == schema(made)
    plain.dispose()


def test_a_newer_database_is_refused_and_left(fresh_store):
    with fresh_store("a.sqlite") as store:
        migrate.upgrade(store)
        with store.writing() as conn:
            conn.execute(text("UPDATE alembic_version SET version_num = '9999'"))
        for act in (migrate.upgrade, migrate.require_current):
            with pytest.raises(SchemaTooNew, match="tables of version 9999, this program knows them up to"):
                act(store)
        assert migrate.current_version(store) == "9999"


def test_a_migration_that_fails_leaves_nothing(fresh_store, monkeypatch: pytest.MonkeyPatch):
    def fail(*_):
        raise MigrationBroken("here", ("newest",))

    monkeypatch.setattr(migrate, "_refuse_dangling", fail)
    with fresh_store("a.sqlite") as store:
        with pytest.raises(MigrationBroken):
            migrate.upgrade(store)
        assert migrate.current_version(store) is None
        with store.reading() as conn:
            assert inspect(conn).get_table_names() == []


def test_rows_that_point_nowhere_are_found(store):
    with store.migrating() as conn:
        conn.execute(text("INSERT INTO newest VALUES ('nowhere', 'k', 7)"))
        with pytest.raises(MigrationBroken, match="in newest"):
            migrate._refuse_dangling(conn, store)
        conn.execute(text("DELETE FROM newest"))


def test_loggers_stay_as_they_were(fresh_store):
    mine = logging.getLogger("mine.before")
    root = logging.getLogger()
    before = (mine.disabled, root.level, list(root.handlers))
    with fresh_store("a.sqlite") as store:
        migrate.upgrade(store)
    assert (mine.disabled, root.level, list(root.handlers)) == before


def test_two_at_once(fresh_store):
    outcomes = []

    def work():
        with fresh_store("a.sqlite") as store:
            outcomes.append(migrate.upgrade(store).after)

    threads = [threading.Thread(target=work) for _ in range(2)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join(timeout=30)
    assert outcomes == [migrate.newest_version()] * 2


def test_the_file_carries_our_mark(place: str):
    with sqlite3.connect(place) as connection:
        assert connection.execute("PRAGMA application_id").fetchone() == (int.from_bytes(b"knkp", "big"),)
    connection.close()


def test_the_migrations_lie_inside_the_package():
    # They are found by path at run time; a wheel holds whatever lies under storage/.
    folder = Path(migrate.__file__).parent / "migrations"
    assert (folder / "env.py").is_file()
    assert any((folder / "versions").glob("v*.py"))
