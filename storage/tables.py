"""The tables. Values go through `storage.types`; migrations bring a database to this form."""

from typing import Any

from sqlalchemy import CheckConstraint, Column, ForeignKey, Index, MetaData, Table, UniqueConstraint, text

from storage.types import Bytes, DayOrInstant, Document, Instant, Name, Prose, Real, Whole

metadata = MetaData(
    naming_convention={
        "pk": "pk_%(table_name)s",
        "fk": "fk_%(table_name)s_%(column_0_name)s",
        "uq": "uq_%(table_name)s_%(column_0_N_name)s",
        "ix": "ix_%(table_name)s_%(column_0_N_name)s",
        "ck": "ck_%(table_name)s_%(constraint_name)s",
    }
)

# STRICT makes SQLite refuse a value of the wrong kind instead of storing it as it comes.
_STRICT: dict[str, Any] = {"sqlite_strict": True}
# Ids are never used twice, even after the newest row was removed: a stream's head is compared by them.
_COUNTED: dict[str, Any] = {"sqlite_autoincrement": True}


def _name(name: str, *rest: Any) -> Column[str]:
    return Column(name, Name, *rest, nullable=False)


def _whole(name: str, *rest: Any) -> Column[int]:
    return Column(name, Whole, *rest, nullable=False)


def _real(name: str) -> Column[float]:
    return Column(name, Real, nullable=False)


def _instant(name: str) -> Column[Any]:
    return Column(name, Instant, nullable=False)


def _at(name: str) -> Column[Any]:
    return Column(name, DayOrInstant, nullable=False)


def _id() -> Column[int]:
    return Column("id", Whole, primary_key=True, autoincrement=True)


def _one_of(column: str, *words: str) -> CheckConstraint:
    listed = ", ".join(f"'{word}'" for word in words)
    return CheckConstraint(f"{column} IN ({listed})", name=column)


streams = Table(
    "streams",
    metadata,
    Column("id", Name, primary_key=True),
    _name("source"),
    Column("split", Name),
    Column("title", Prose, nullable=False),
    Column("slate", Name),
    _name("shape"),
    _instant("first_read_utc"),
    _instant("last_seen_utc"),
    _whole("epoch"),
    Column("fingerprint", Name),
    Column("hushed_until_utc", Instant),
    _one_of("shape", "calendar", "release"),
    Index(None, "source"),
    **_STRICT,
)

rounds = Table(
    "rounds",
    metadata,
    _id(),
    _name("source"),
    _instant("started_utc"),
    Column("ended_utc", Instant),
    _name("outcome"),
    _whole("rows_used"),
    _whole("stored"),
    _whole("unchanged"),
    _whole("held"),
    _whole("absent"),
    _whole("kept_out_count"),
    Column("kept_out", Document),
    Column("message", Prose),
    _one_of("outcome", "under way", "good", "nothing new", "failed", "broken off"),
    Index(None, "source", "id"),
    Index(
        "ix_rounds_detail",
        "source",
        "id",
        sqlite_where=text("kept_out IS NOT NULL"),
        postgresql_where=text("kept_out IS NOT NULL"),
    ),
    Index(
        "ix_rounds_under_way",
        "id",
        sqlite_where=text("ended_utc IS NULL"),
        postgresql_where=text("ended_utc IS NULL"),
    ),
    **_STRICT,
    **_COUNTED,
)

validators = Table(
    "validators",
    metadata,
    Column("source", Name, primary_key=True),
    Column("etag", Prose),
    Column("last_modified", Prose),
    _name("about"),
    _instant("written_utc"),
    **_STRICT,
)

readings = Table(
    "readings",
    metadata,
    _id(),
    _name("stream_id", ForeignKey("streams.id")),
    _name("key"),
    _at("at"),
    Column("title", Prose),
    Column("count", Whole),
    Column("exposure", Real),
    _instant("read_utc"),
    Column("round_id", Whole, ForeignKey("rounds.id")),
    Index(None, "stream_id", "key", "id"),
    **_STRICT,
    **_COUNTED,
)

# The newest reading of every key, kept beside the readings: ten years of corrections do not slow a poll down.
newest = Table(
    "newest",
    metadata,
    Column("stream_id", Name, ForeignKey("streams.id"), primary_key=True),
    Column("key", Name, primary_key=True),
    _whole("reading_id", ForeignKey("readings.id")),
    **_STRICT,
)

# The reading that held when a release was first read at its final age: it counts, whatever is read later.
ripe = Table(
    "ripe",
    metadata,
    Column("stream_id", Name, ForeignKey("streams.id"), primary_key=True),
    Column("key", Name, primary_key=True),
    _whole("reading_id", ForeignKey("readings.id")),
    **_STRICT,
)

checkpoints = Table(
    "checkpoints",
    metadata,
    _id(),
    _name("stream_id", ForeignKey("streams.id")),
    _whole("folded"),
    _name("digest"),
    _name("fingerprint"),
    Column("body", Bytes, nullable=False),
    _instant("written_utc"),
    UniqueConstraint("stream_id", "folded"),
    **_STRICT,
    **_COUNTED,
)

posteriors = Table(
    "posteriors",
    metadata,
    _id(),
    _name("stream_id", ForeignKey("streams.id")),
    _whole("place"),
    _name("key"),
    _at("at"),
    Column("count", Whole),
    _whole("position"),
    _whole("counted"),
    _real("recent_shift"),
    _whole("run_length_mode"),
    _real("level_low"),
    _real("level_mid"),
    _real("level_high"),
    _real("one_off"),
    _real("log_predictive"),
    _real("pit_low"),
    _real("pit_high"),
    Column("history", Bytes, nullable=False),
    _name("fingerprint"),
    Column("reading_id", Whole, ForeignKey("readings.id")),
    _instant("written_utc"),
    Column("superseded_utc", Instant),
    Index(
        "ix_posteriors_current",
        "stream_id",
        "place",
        unique=True,
        sqlite_where=text("superseded_utc IS NULL"),
        postgresql_where=text("superseded_utc IS NULL"),
    ),
    Index(
        "ix_posteriors_evidence",
        "stream_id",
        "place",
        sqlite_where=text("superseded_utc IS NOT NULL"),
        postgresql_where=text("superseded_utc IS NOT NULL"),
    ),
    Index(
        "ix_posteriors_superseded",
        "superseded_utc",
        sqlite_where=text("superseded_utc IS NOT NULL"),
        postgresql_where=text("superseded_utc IS NOT NULL"),
    ),
    **_STRICT,
    **_COUNTED,
)

shifts = Table(
    "shifts",
    metadata,
    Column("id", Name, primary_key=True),
    _name("stream_id", ForeignKey("streams.id")),
    _name("origin"),
    _name("state"),
    _name("announced_key"),
    _whole("announced_position"),
    _at("announced_at"),
    _instant("announced_utc"),
    _name("start_key"),
    _whole("start_position"),
    _at("start_at"),
    _whole("region_first"),
    _whole("region_last"),
    Column("region", Document, nullable=False),
    _real("probability"),
    _real("level_before_low"),
    _real("level_before_mid"),
    _real("level_before_high"),
    _real("level_after_low"),
    _real("level_after_mid"),
    _real("level_after_high"),
    _whole("late"),
    _name("fingerprint"),
    Column("reading_id", Whole, ForeignKey("readings.id")),
    Column("told_utc", Instant),
    Column("told_how", Name),
    Column("figures", Document, nullable=False),
    _one_of("origin", "live", "history"),
    _one_of("state", "emerging", "settled", "withdrawn"),
    CheckConstraint("late IN (0, 1)", name="late"),
    Index(None, "stream_id", "announced_position"),
    Index(
        "ix_shifts_untold",
        "announced_utc",
        sqlite_where=text("told_utc IS NULL"),
        postgresql_where=text("told_utc IS NULL"),
    ),
    **_STRICT,
)

deliveries = Table(
    "deliveries",
    metadata,
    Column("id", Name, primary_key=True),
    _name("outlet"),
    Column("shift_id", Name, ForeignKey("shifts.id")),
    Column("body", Bytes, nullable=False),
    _instant("created_utc"),
    _instant("due_utc"),
    _name("state"),
    _whole("attempts"),
    Column("last_status", Whole),
    Column("last_error", Prose),
    _one_of("state", "waiting", "delivered", "given_up"),
    Index(None, "state", "due_utc"),
    Index(None, "shift_id"),
    **_STRICT,
)

attempts = Table(
    "attempts",
    metadata,
    _id(),
    _name("delivery_id", ForeignKey("deliveries.id")),
    _instant("at_utc"),
    _name("outcome"),
    Column("status", Whole),
    Column("error", Prose),
    _real("took_seconds"),
    Index(None, "delivery_id", "id"),
    **_STRICT,
    **_COUNTED,
)
