"""The few writes that every table shares."""

from collections.abc import Mapping, Sequence
from typing import Any

from sqlalchemy import Connection, Table, insert, select, update

from storage.errors import NoSuchRow

_SINGULAR = {"deliveries": "delivery", "rounds": "round", "shifts": "shift", "streams": "stream"}


def insert_new(conn: Connection, table: Table, rows: Sequence[Mapping[str, Any]]) -> None:
    """Inserts the rows, of which there may be none."""
    if rows:
        conn.execute(insert(table), [dict(row) for row in rows])


def insert_once(conn: Connection, table: Table, row: Mapping[str, Any]) -> bool:
    """Inserts a row unless its id is there already; whether it was inserted."""
    if conn.scalar(select(table.c.id).where(table.c.id == row["id"])) is not None:
        return False
    conn.execute(insert(table).values(**row))
    return True


def change_one(conn: Connection, table: Table, id: object, values: Mapping[str, Any]) -> None:
    """Changes the row with this id, which must be there."""
    done = conn.execute(update(table).where(table.c.id == id).values(**values))
    if done.rowcount != 1:
        raise NoSuchRow(_SINGULAR[table.name], id)
