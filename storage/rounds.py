"""Rounds: what each pass for a source did, and what it kept out."""

from dataclasses import asdict, dataclass
from datetime import datetime
from typing import Any

from sqlalchemy import Connection, RowMapping, insert, select, update

from storage.errors import NoSuchRow
from storage.tables import rounds
from storage.writes import change_one

UNDER_WAY = "under way"
GOOD = "good"
NOTHING_NEW = "nothing new"
FAILED = "failed"
BROKEN_OFF = "broken off"

KEPT_OUT_AT_MOST = 100
_TEXT_AT_MOST = 300
# The rows kept out are shown for so many rounds of a source that had any; their number stays for ever.
ROUNDS_WITH_DETAIL = 50
_AT_ONCE = 1000


@dataclass(frozen=True, slots=True)
class KeptOutRow:
    """A row that could not be used: its number in the document, why, and what it said."""

    row: int
    why: str
    text: str


@dataclass(frozen=True, slots=True)
class RoundCounts:
    """What became of the rows of a document. `kept_out_count` None means as many as `kept_out` has."""

    rows_used: int
    stored: int
    unchanged: int
    absent: int
    held: int = 0
    kept_out: tuple[KeptOutRow, ...] = ()
    kept_out_count: int | None = None


@dataclass(frozen=True, slots=True)
class Round:
    """A round as it is kept. `kept_out` may hold fewer rows than `kept_out_count` says."""

    id: int
    source: str
    started_utc: datetime
    ended_utc: datetime | None
    outcome: str
    rows_used: int
    stored: int
    unchanged: int
    held: int
    absent: int
    kept_out_count: int
    kept_out: tuple[KeptOutRow, ...]
    message: str | None


def begin_round(conn: Connection, source: str, *, now: datetime) -> int:
    """Opens a round; gives its id."""
    nothing = {"rows_used": 0, "stored": 0, "unchanged": 0, "held": 0, "absent": 0, "kept_out_count": 0}
    opened = insert(rounds).values(source=source, started_utc=now, outcome=UNDER_WAY, **nothing)
    return int(conn.scalar(opened.returning(rounds.c.id)) or 0)


def note_counts(conn: Connection, round_id: int, counts: RoundCounts) -> None:
    """Notes what became of the rows, in the transaction that stores the readings."""
    shown = [_clipped(row) for row in counts.kept_out[:KEPT_OUT_AT_MOST]]
    number = len(counts.kept_out) if counts.kept_out_count is None else counts.kept_out_count
    plain = {name: getattr(counts, name) for name in ("rows_used", "stored", "unchanged", "absent", "held")}
    change_one(conn, rounds, round_id, plain | {"kept_out_count": number, "kept_out": shown or None})


def end_round(
    conn: Connection, round_id: int, outcome: str, *, now: datetime, message: str | None = None
) -> None:
    """Closes a round."""
    change_one(conn, rounds, round_id, {"ended_utc": now, "outcome": outcome, "message": message})
    _forget_old_detail(conn, round_id)


def break_off_unfinished(conn: Connection, *, now: datetime, source: str | None = None) -> int:
    """Closes the rounds that a crash left open; gives their number. For the start, when none is under way."""
    query = update(rounds).where(rounds.c.ended_utc.is_(None))
    if source is not None:
        query = query.where(rounds.c.source == source)
    message = "The program ended while this round was under way."
    return conn.execute(query.values(ended_utc=now, outcome=BROKEN_OFF, message=message)).rowcount


def get_round(conn: Connection, round_id: int) -> Round:
    """The round with this id."""
    row = conn.execute(select(rounds).where(rounds.c.id == round_id)).first()
    if row is None:
        raise NoSuchRow("round", round_id)
    return _round(row._mapping)


def list_rounds(conn: Connection, *, source: str | None = None, limit: int = 50) -> tuple[Round, ...]:
    """The newest rounds, newest first."""
    query = select(rounds).order_by(rounds.c.id.desc()).limit(limit)
    if source is not None:
        query = query.where(rounds.c.source == source)
    return tuple(_round(row._mapping) for row in conn.execute(query))


def good_rounds(conn: Connection, source: str, *, limit: int) -> tuple[Round, ...]:
    """The newest rounds that reached the source, whether or not they found anything new, newest first."""
    good = select(rounds).where(rounds.c.source == source, rounds.c.outcome.in_((GOOD, NOTHING_NEW)))
    return tuple(_round(row._mapping) for row in conn.execute(good.order_by(rounds.c.id.desc()).limit(limit)))


def last_good_round(conn: Connection, source: str) -> Round | None:
    """The newest round that reached the source."""
    found = good_rounds(conn, source, limit=1)
    return found[0] if found else None


def last_good_rounds(conn: Connection) -> dict[str, Round]:
    """The last good round of each source that has one."""
    sources = conn.scalars(select(rounds.c.source).distinct()).all()
    found = {source: last_good_round(conn, source) for source in sources}
    return {source: one for source, one in found.items() if one is not None}


def _clipped(row: KeptOutRow) -> dict[str, Any]:
    return asdict(row) | {"why": row.why[:_TEXT_AT_MOST], "text": row.text[:_TEXT_AT_MOST]}


def _forget_old_detail(conn: Connection, round_id: int) -> None:
    source = select(rounds.c.source).where(rounds.c.id == round_id).scalar_subquery()
    detailed = select(rounds.c.id).where(rounds.c.source == source, rounds.c.kept_out.is_not(None))
    old = conn.scalars(detailed.order_by(rounds.c.id.desc()).offset(ROUNDS_WITH_DETAIL).limit(_AT_ONCE)).all()
    conn.execute(update(rounds).where(rounds.c.id.in_(old)).values(kept_out=None))


def _round(row: RowMapping) -> Round:
    shown = tuple(KeptOutRow(**one) for one in row["kept_out"] or ())
    return Round(**dict(row) | {"kept_out": shown})
