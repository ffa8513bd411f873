"""A database opened for one query: read-only as far as it enforces that, with limits as far as it has them.

SQLite is opened with mode=ro and query_only; PostgreSQL runs the query in a read-only transaction with a
statement limit. With any other database the transaction is rolled back at the end, which is all that can be
had from here: `enforces_read_only` and `enforces_deadline` let `check` say so.
"""

import math
import sqlite3
from urllib.parse import quote, urlsplit

from sqlalchemy import Connection, Engine, create_engine
from sqlalchemy.engine import URL, make_url
from sqlalchemy.exc import ArgumentError, NoSuchModuleError, SQLAlchemyError
from sqlalchemy.pool import NullPool

from service.calls import Deadline
from service.sources.errors import MissingDriver, SourceUnreadable
from service.sources.plans import SqlPlan

STEPS_BETWEEN_LOOKS = 10_000
SHORTEST_HIDDEN_PART = 3
LIMITED_DRIVERS = frozenset({"psycopg", "psycopg2", "pymysql", "mysqldb"})
# Without these a peer that is gone for good is waited for until the system gives up, which takes hours.
KEEPALIVES = {"keepalives": 1, "keepalives_idle": 10, "keepalives_interval": 5, "keepalives_count": 3}


def enforces_read_only(address: str) -> bool:
    """Whether the database itself keeps the query from writing."""
    url = _parsed(address)
    return url is not None and url.get_backend_name() in ("sqlite", "postgresql")


def enforces_deadline(address: str) -> bool:
    """Whether a query that hangs is ended at the deadline, and not only looked at between its rows."""
    url = _parsed(address)
    return url is not None and (url.get_backend_name() == "sqlite" or _driver(url) in LIMITED_DRIVERS)


def open_engine(plan: SqlPlan, deadline: Deadline) -> Engine:
    """An engine without a pool. Nothing is connected yet.

    Raises
    ------
    SourceUnreadable
        If the address is none, or its driver is missing.
    """
    url = _parsed(plan.address)
    if url is None:
        raise _unreadable(
            plan, "its address is no database address, which looks like sqlite:///counts.sqlite."
        )
    if url.get_backend_name() == "sqlite":
        return _sqlite(plan, url, deadline)
    try:
        return create_engine(url, poolclass=NullPool, connect_args=_limits(url, deadline))
    except ModuleNotFoundError as error:
        failure: SourceUnreadable = MissingDriver(plan.name, error.name or url.drivername)
    except NoSuchModuleError:
        failure = _unreadable(plan, f'no kind of database is known as "{url.drivername}"; check its address.')
    except (SQLAlchemyError, TypeError, ValueError, ImportError):
        failure = _unreadable(plan, "its database address has parts that the driver does not take.")
    raise failure


def hidden_parts(address: str) -> tuple[str, ...]:
    """Texts of an address that no error may show: all of it, and its longer parts."""
    url = _parsed(address)
    if url is None:
        return (address,)
    values = [str(value) for value in url.query.values()]
    parts = [url.username, url.password, url.host, url.database, *values]
    longer = [str(part) for part in parts if part and len(str(part)) >= SHORTEST_HIDDEN_PART]
    return (address, *longer)


def login_texts(address: str) -> tuple[str, ...]:
    """The texts of an address that no row may show; names of hosts and users may well stand in rows."""
    url = _parsed(address)
    password = str(url.password or "") if url is not None else ""
    return (address, password) if len(password) >= SHORTEST_HIDDEN_PART else (address,)


def begin_read_only(connection: Connection, deadline: Deadline) -> None:
    """The first statements of the transaction, where the database has them."""
    for statement in opening_statements(connection.dialect.name, deadline.remaining()):
        connection.exec_driver_sql(statement)


def opening_statements(dialect: str, seconds: float) -> tuple[str, ...]:
    """The session is made read-only too, for a query that would end the transaction."""
    if dialect != "postgresql":
        return ()
    return (
        "SET TRANSACTION READ ONLY",
        "SET SESSION CHARACTERISTICS AS TRANSACTION READ ONLY",
        f"SET statement_timeout = {max(1, math.ceil(seconds * 1000))}",
    )


def _parsed(address: str) -> URL | None:
    try:
        return make_url(address)
    except (ArgumentError, ValueError):
        return None


def _driver(url: URL) -> str:
    _, plus, driver = url.drivername.partition("+")
    return driver if plus else {"postgresql": "psycopg", "mysql": "mysqldb"}.get(url.drivername, "")


def _limits(url: URL, deadline: Deadline) -> dict[str, int]:
    seconds = max(1, math.ceil(deadline.remaining()))
    match _driver(url):
        case "psycopg" | "psycopg2":
            return {"connect_timeout": max(2, seconds), **KEEPALIVES}
        case "pymysql" | "mysqldb":
            return {"connect_timeout": seconds, "read_timeout": seconds, "write_timeout": seconds}
        case _:
            return {}


def _sqlite(plan: SqlPlan, url: URL, deadline: Deadline) -> Engine:
    path = urlsplit(url.database).path if url.database and url.database.startswith("file:") else url.database
    if not path or path == ":memory:":
        raise _unreadable(
            plan, "its address names no file; an SQLite address looks like sqlite:///counts.sqlite."
        )

    def connect() -> sqlite3.Connection:
        connection = sqlite3.connect(
            f"file:{quote(path)}?mode=ro", uri=True, timeout=max(0.0, deadline.remaining())
        )
        connection.set_progress_handler(lambda: int(deadline.remaining() <= 0), STEPS_BETWEEN_LOOKS)
        # mode=ro holds for this file only: ATTACH would still make another one.
        connection.setlimit(sqlite3.SQLITE_LIMIT_ATTACHED, 0)
        connection.execute("PRAGMA query_only = ON").close()
        return connection

    return create_engine("sqlite://", creator=connect, poolclass=NullPool)


def _unreadable(plan: SqlPlan, why: str) -> SourceUnreadable:
    return SourceUnreadable(plan.name, why)
