"""From the settings file to the open database."""

import datetime
import os
from collections.abc import Iterator
from contextlib import contextmanager
from zoneinfo import ZoneInfo

from sqlalchemy import Connection

from config.loading import load_settings, read_settings
from config.settings import Settings
from service.cli.errors import UnknownName
from service.cli.options import Given
from storage.engine import open_existing_store
from storage.migrate import require_current
from storage.streams import Stream, find_stream, list_streams


@contextmanager
def reading(given: Given) -> Iterator[Connection]:
    """One consistent picture of the database that the settings name.

    Raises
    ------
    SettingsError, StoreError
        If the settings are faulty, or the database is not there or not of this program's version.
    """
    with open_existing_store(database_of(given)) as store:
        require_current(store)
        with store.reading() as connection:
            yield connection


@contextmanager
def writing(given: Given) -> Iterator[Connection]:
    """One transaction on the database that the settings name; raises as `reading` does."""
    with open_existing_store(database_of(given)) as store:
        require_current(store)
        with store.writing() as connection:
            yield connection


def settings_with_secrets(given: Given) -> Settings:
    """The settings with all that they refer to, for what reaches sources and outlets.

    Raises
    ------
    SettingsError
        With all that is wrong with them.
    """
    return load_settings(given.settings, os.environ)


def settings_of(given: Given) -> Settings:
    """The settings alone: whoever only looks need not know the daemon's secrets. Raises as the other does."""
    return read_settings(given.settings)


def database_of(given: Given) -> str:
    """Where the settings put the database."""
    return str(settings_of(given).service.database)


def zone_of(given: Given) -> ZoneInfo:
    """The zone in which the settings' people live."""
    return ZoneInfo(settings_of(given).service.zone)


def require_stream(conn: Connection, name: str) -> Stream:
    """The stream of that id.

    Raises
    ------
    UnknownName
        If there is none.
    """
    found = find_stream(conn, name)
    if found is None:
        raise UnknownName("stream", name, [stream.id for stream in list_streams(conn)])
    return found


def now() -> datetime.datetime:
    """The instant at which a command was given."""
    return datetime.datetime.now(datetime.UTC)
