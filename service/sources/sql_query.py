"""Rows of one SQL query."""

from collections.abc import Iterator, Sequence

from sqlalchemy import Connection, CursorResult, Engine
from sqlalchemy.exc import DBAPIError, SQLAlchemyError

from service.calls import Deadline, Monotonic
from service.sources.document import Document, KeptOut, Row
from service.sources.errors import SourceUnreadable
from service.sources.plans import SqlPlan
from service.sources.rows import RowRules, cut, hide, understand
from service.sources.sql_engine import begin_read_only, hidden_parts, login_texts, open_engine
from service.sources.table import columns_of

BATCH = 1000

Cells = Sequence[object]


def read_sql(plan: SqlPlan, monotonic: Monotonic) -> Document:
    """The query's rows.

    Raises
    ------
    SourceUnreadable
        If they cannot be had, or not all of them.
    """
    deadline = Deadline.after(plan.bounds.deadline_seconds, monotonic)
    engine = open_engine(plan, deadline)
    try:
        header, rows = _result(plan, engine, deadline)
    finally:
        engine.dispose()
    return _document(plan, header, rows)


def _document(plan: SqlPlan, header: list[str], rows: list[Cells]) -> Document:
    columns = columns_of(plan.name, plan.fields, header)
    rules = RowRules(plan.zone, login_texts(plan.address))
    understood = [
        understand({name: cells[place] for name, place in columns}, number, rules)
        for number, cells in enumerate(rows, start=1)
    ]
    return Document(
        tuple(one for one in understood if isinstance(one, Row)),
        tuple(one for one in understood if isinstance(one, KeptOut)),
    )


def _result(plan: SqlPlan, engine: Engine, deadline: Deadline) -> tuple[list[str], list[Cells]]:
    """Closing the connection rolls back, whatever the query did."""
    with _connected(plan, engine, deadline) as connection:
        try:
            begin_read_only(connection, deadline)
            return _asked(plan, connection, deadline)
        except (SQLAlchemyError, ValueError) as error:
            why = _why(plan, error)
        if deadline.remaining() <= 0:
            raise _too_late(plan)
        raise _unreadable(plan, f"its query failed: {why}")


def _connected(plan: SqlPlan, engine: Engine, deadline: Deadline) -> Connection:
    """What a driver says about connecting may name host, user and database, so that it is not shown."""
    try:
        return engine.connect()
    except (SQLAlchemyError, OSError, ValueError, TypeError) as error:
        kind = type(error.orig if isinstance(error, DBAPIError) else error).__name__
    if deadline.remaining() <= 0:
        raise _too_late(plan)
    raise _unreadable(plan, f"its database cannot be opened ({kind}); check address, login and that it runs.")


def _asked(plan: SqlPlan, connection: Connection, deadline: Deadline) -> tuple[list[str], list[Cells]]:
    # The driver gets the query as it is written: colons and percent signs in it are no parameters.
    plain = connection.execution_options(stream_results=True, no_parameters=True)
    with plain.exec_driver_sql(plan.query) as result:
        if not result.returns_rows:
            raise _unreadable(plan, "its query gives no rows; needed is one SELECT.")
        return list(result.keys()), list(_bounded(plan, result, deadline))


def _bounded(plan: SqlPlan, result: CursorResult[tuple[object, ...]], deadline: Deadline) -> Iterator[Cells]:
    taken = 0
    while batch := result.fetchmany(BATCH):
        taken += len(batch)
        if taken > plan.bounds.most_rows:
            raise _unreadable(
                plan, f"its query gives more than the {plan.bounds.most_rows} rows that are allowed."
            )
        if deadline.remaining() <= 0:
            raise _too_late(plan)
        yield from batch


def _why(plan: SqlPlan, error: Exception) -> str:
    """The database's own first line about the query, without the statement that SQLAlchemy adds."""
    text = str(error.orig if isinstance(error, DBAPIError) else type(error).__name__)
    lines = hide(text, hidden_parts(plan.address)).strip().splitlines()
    return cut(lines[0] if lines else type(error).__name__).rstrip(".") + "."


def _too_late(plan: SqlPlan) -> SourceUnreadable:
    return _unreadable(plan, f"its query did not give all rows within {plan.bounds.deadline_seconds:g} s.")


def _unreadable(plan: SqlPlan, why: str) -> SourceUnreadable:
    return SourceUnreadable(plan.name, why)
