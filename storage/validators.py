"""What a source's server gave to ask "anything new since?" with."""

from dataclasses import asdict, dataclass
from datetime import datetime

from sqlalchemy import Connection, delete, select

from storage.tables import validators
from storage.writes import insert_new


@dataclass(frozen=True, slots=True)
class Validators:
    """ETag and Last-Modified of the last document; `about` is a digest of the request and the template."""

    etag: str | None
    last_modified: str | None
    about: str


def keep_validators(conn: Connection, source: str, given: Validators, *, now: datetime) -> None:
    """Replaces older ones: in the transaction that stores the document's readings, never before."""
    forget_validators(conn, source)
    insert_new(conn, validators, [asdict(given) | {"source": source, "written_utc": now}])


def find_validators(conn: Connection, source: str, *, about: str) -> Validators | None:
    """Those of the source, unless they are about something else than is asked now."""
    mine = (validators.c.source == source) & (validators.c.about == about)
    row = conn.execute(select(validators).where(mine)).first()
    return None if row is None else Validators(row.etag, row.last_modified, row.about)


def forget_validators(conn: Connection, source: str) -> None:
    """The next round reads the whole document."""
    conn.execute(delete(validators).where(validators.c.source == source))
