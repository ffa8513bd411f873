"""What is asked at every round looks things up by an index: ten years of rows do not slow it down."""

from collections.abc import Callable
from datetime import UTC, date, datetime

import pytest
from sqlalchemy import Connection, create_mock_engine, event

from storage import checkpoints, outbox, posteriors, readings, ripe, rounds, shifts
from storage.engine import Store
from storage.tables import metadata

NOW = datetime(2026, 3, 2, tzinfo=UTC)
OFTEN: dict[str, Callable[[Connection], object]] = {
    "newest readings": lambda conn: readings.newest_readings(conn, "quay"),
    "head": lambda conn: readings.head(conn, "quay"),
    "reach of a source": lambda conn: readings.newest_at(conn, "plays"),
    "ripe readings": lambda conn: ripe.ripe_readings(conn, "quay"),
    "history": lambda conn: posteriors.history(conn, "quay", since=date(2026, 3, 1), limit=3),
    "newest posteriors": posteriors.newest_posteriors,
    "evidence": lambda conn: posteriors.evidence(conn, "quay", 3),
    "superseding": lambda conn: posteriors.supersede_from(conn, "quay", 3, now=NOW),
    "pruning": lambda conn: posteriors.prune_superseded(conn, before=NOW),
    "checkpoints": lambda conn: checkpoints.list_checkpoints(conn, "quay", fingerprint="f"),
    "last good round": lambda conn: rounds.last_good_round(conn, "plays"),
    "end of a round": lambda conn: rounds.end_round(conn, 1, rounds.GOOD, now=NOW),
    "overlap": lambda conn: shifts.overlapping_shifts(conn, "quay", first_position=1, last_position=2),
    "due": lambda conn: outbox.due_deliveries(conn, now=NOW),
}


@pytest.mark.parametrize("question", OFTEN)
@pytest.mark.usefixtures("stream")
def test_no_question_goes_through_a_whole_table(store: Store, question: str):
    plans: list[str] = []

    def explain(conn, _cursor, statement, parameters, _context, many):
        if statement.startswith(("SELECT", "UPDATE", "DELETE")):
            given = parameters[0] if many else parameters
            raw = conn.connection.dbapi_connection
            plans.extend(row[3] for row in raw.execute(f"EXPLAIN QUERY PLAN {statement}", given))

    with store.writing() as conn:
        assert rounds.begin_round(conn, "plays", now=NOW) == 1
        event.listen(store.engine, "before_cursor_execute", explain)
        OFTEN[question](conn)
    assert plans
    large = ("readings", "posteriors", "rounds", "deliveries", "shifts", "newest", "ripe", "checkpoints")
    scans = [plan for plan in plans if plan.startswith(tuple(f"SCAN {table}" for table in large))]
    assert scans == []


def test_the_tables_can_be_made_on_postgresql():
    # Only their text: no PostgreSQL is asked. It is there so that the types stay portable.
    statements: list[str] = []
    engine = create_mock_engine("postgresql+psycopg://", lambda sql, *_: statements.append(text_of(sql)))

    def text_of(sql) -> str:
        return " ".join(str(sql.compile(dialect=engine.dialect)).split())

    metadata.create_all(engine, checkfirst=False)
    text = "\n".join(statements)
    assert "CREATE TABLE readings ( id BIGSERIAL NOT NULL, stream_id TEXT NOT NULL" in text
    assert "exposure DOUBLE PRECISION" in text
    assert "body BYTEA NOT NULL" in text
    assert "ON posteriors (stream_id, place) WHERE superseded_utc IS NULL" in text
    assert "STRICT" not in text
