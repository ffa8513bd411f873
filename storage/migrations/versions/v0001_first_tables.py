"""The first tables."""

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None

# Spelt out here rather than taken from storage.types: a migration must do the same for ever.
TEXT = sa.Text()
BYTES = sa.LargeBinary()
WHOLE = sa.BigInteger().with_variant(sa.Integer(), "sqlite")
REAL: sa.types.TypeEngine[float] = sa.Double().with_variant(sa.REAL(), "sqlite")


def upgrade() -> None:
    _rounds()
    _streams()
    _validators()
    _checkpoints()
    _readings()
    _newest()
    _posteriors()
    _ripe()
    _shifts()
    _deliveries()
    _attempts()


def _rounds() -> None:
    op.create_table(
        "rounds",
        sa.Column("id", WHOLE, autoincrement=True, nullable=False),
        sa.Column("source", TEXT, nullable=False),
        sa.Column("started_utc", TEXT, nullable=False),
        sa.Column("ended_utc", TEXT, nullable=True),
        sa.Column("outcome", TEXT, nullable=False),
        sa.Column("rows_used", WHOLE, nullable=False),
        sa.Column("stored", WHOLE, nullable=False),
        sa.Column("unchanged", WHOLE, nullable=False),
        sa.Column("held", WHOLE, nullable=False),
        sa.Column("absent", WHOLE, nullable=False),
        sa.Column("kept_out_count", WHOLE, nullable=False),
        sa.Column("kept_out", TEXT, nullable=True),
        sa.Column("message", TEXT, nullable=True),
        sa.CheckConstraint(
            "outcome IN ('under way', 'good', 'nothing new', 'failed', 'broken off')",
            name=op.f("ck_rounds_outcome"),
        ),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_rounds")),
        sqlite_autoincrement=True,
        sqlite_strict=True,
    )
    op.create_index(
        "ix_rounds_detail",
        "rounds",
        ["source", "id"],
        unique=False,
        sqlite_where=sa.text("kept_out IS NOT NULL"),
        postgresql_where=sa.text("kept_out IS NOT NULL"),
    )
    op.create_index(op.f("ix_rounds_source_id"), "rounds", ["source", "id"], unique=False)
    op.create_index(
        "ix_rounds_under_way",
        "rounds",
        ["id"],
        unique=False,
        sqlite_where=sa.text("ended_utc IS NULL"),
        postgresql_where=sa.text("ended_utc IS NULL"),
    )


def _streams() -> None:
    op.create_table(
        "streams",
        sa.Column("id", TEXT, nullable=False),
        sa.Column("source", TEXT, nullable=False),
        sa.Column("split", TEXT, nullable=True),
        sa.Column("title", TEXT, nullable=False),
        sa.Column("slate", TEXT, nullable=True),
        sa.Column("shape", TEXT, nullable=False),
        sa.Column("first_read_utc", TEXT, nullable=False),
        sa.Column("last_seen_utc", TEXT, nullable=False),
        sa.Column("epoch", WHOLE, nullable=False),
        sa.Column("fingerprint", TEXT, nullable=True),
        sa.Column("hushed_until_utc", TEXT, nullable=True),
        sa.CheckConstraint("shape IN ('calendar', 'release')", name=op.f("ck_streams_shape")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_streams")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_streams_source"), "streams", ["source"], unique=False)


def _validators() -> None:
    op.create_table(
        "validators",
        sa.Column("source", TEXT, nullable=False),
        sa.Column("etag", TEXT, nullable=True),
        sa.Column("last_modified", TEXT, nullable=True),
        sa.Column("about", TEXT, nullable=False),
        sa.Column("written_utc", TEXT, nullable=False),
        sa.PrimaryKeyConstraint("source", name=op.f("pk_validators")),
        sqlite_strict=True,
    )


def _checkpoints() -> None:
    op.create_table(
        "checkpoints",
        sa.Column("id", WHOLE, autoincrement=True, nullable=False),
        sa.Column("stream_id", TEXT, nullable=False),
        sa.Column("folded", WHOLE, nullable=False),
        sa.Column("digest", TEXT, nullable=False),
        sa.Column("fingerprint", TEXT, nullable=False),
        sa.Column("body", BYTES, nullable=False),
        sa.Column("written_utc", TEXT, nullable=False),
        sa.ForeignKeyConstraint(["stream_id"], ["streams.id"], name=op.f("fk_checkpoints_stream_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_checkpoints")),
        sa.UniqueConstraint("stream_id", "folded", name=op.f("uq_checkpoints_stream_id_folded")),
        sqlite_autoincrement=True,
        sqlite_strict=True,
    )


def _readings() -> None:
    op.create_table(
        "readings",
        sa.Column("id", WHOLE, autoincrement=True, nullable=False),
        sa.Column("stream_id", TEXT, nullable=False),
        sa.Column("key", TEXT, nullable=False),
        sa.Column("at", TEXT, nullable=False),
        sa.Column("title", TEXT, nullable=True),
        sa.Column("count", WHOLE, nullable=True),
        sa.Column("exposure", REAL, nullable=True),
        sa.Column("read_utc", TEXT, nullable=False),
        sa.Column("round_id", WHOLE, nullable=True),
        sa.ForeignKeyConstraint(["round_id"], ["rounds.id"], name=op.f("fk_readings_round_id")),
        sa.ForeignKeyConstraint(["stream_id"], ["streams.id"], name=op.f("fk_readings_stream_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_readings")),
        sqlite_autoincrement=True,
        sqlite_strict=True,
    )
    op.create_index(
        op.f("ix_readings_stream_id_key_id"), "readings", ["stream_id", "key", "id"], unique=False
    )


def _newest() -> None:
    op.create_table(
        "newest",
        sa.Column("stream_id", TEXT, nullable=False),
        sa.Column("key", TEXT, nullable=False),
        sa.Column("reading_id", WHOLE, nullable=False),
        sa.ForeignKeyConstraint(["reading_id"], ["readings.id"], name=op.f("fk_newest_reading_id")),
        sa.ForeignKeyConstraint(["stream_id"], ["streams.id"], name=op.f("fk_newest_stream_id")),
        sa.PrimaryKeyConstraint("stream_id", "key", name=op.f("pk_newest")),
        sqlite_strict=True,
    )


def _posteriors() -> None:
    op.create_table(
        "posteriors",
        sa.Column("id", WHOLE, autoincrement=True, nullable=False),
        sa.Column("stream_id", TEXT, nullable=False),
        sa.Column("place", WHOLE, nullable=False),
        sa.Column("key", TEXT, nullable=False),
        sa.Column("at", TEXT, nullable=False),
        sa.Column("count", WHOLE, nullable=True),
        sa.Column("position", WHOLE, nullable=False),
        sa.Column("counted", WHOLE, nullable=False),
        sa.Column("recent_shift", REAL, nullable=False),
        sa.Column("run_length_mode", WHOLE, nullable=False),
        sa.Column("level_low", REAL, nullable=False),
        sa.Column("level_mid", REAL, nullable=False),
        sa.Column("level_high", REAL, nullable=False),
        sa.Column("one_off", REAL, nullable=False),
        sa.Column("log_predictive", REAL, nullable=False),
        sa.Column("pit_low", REAL, nullable=False),
        sa.Column("pit_high", REAL, nullable=False),
        sa.Column("history", BYTES, nullable=False),
        sa.Column("fingerprint", TEXT, nullable=False),
        sa.Column("reading_id", WHOLE, nullable=True),
        sa.Column("written_utc", TEXT, nullable=False),
        sa.Column("superseded_utc", TEXT, nullable=True),
        sa.ForeignKeyConstraint(["reading_id"], ["readings.id"], name=op.f("fk_posteriors_reading_id")),
        sa.ForeignKeyConstraint(["stream_id"], ["streams.id"], name=op.f("fk_posteriors_stream_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_posteriors")),
        sqlite_autoincrement=True,
        sqlite_strict=True,
    )
    op.create_index(
        "ix_posteriors_current",
        "posteriors",
        ["stream_id", "place"],
        unique=True,
        sqlite_where=sa.text("superseded_utc IS NULL"),
        postgresql_where=sa.text("superseded_utc IS NULL"),
    )
    op.create_index(
        "ix_posteriors_evidence",
        "posteriors",
        ["stream_id", "place"],
        unique=False,
        sqlite_where=sa.text("superseded_utc IS NOT NULL"),
        postgresql_where=sa.text("superseded_utc IS NOT NULL"),
    )
    op.create_index(
        "ix_posteriors_superseded",
        "posteriors",
        ["superseded_utc"],
        unique=False,
        sqlite_where=sa.text("superseded_utc IS NOT NULL"),
        postgresql_where=sa.text("superseded_utc IS NOT NULL"),
    )


def _ripe() -> None:
    op.create_table(
        "ripe",
        sa.Column("stream_id", TEXT, nullable=False),
        sa.Column("key", TEXT, nullable=False),
        sa.Column("reading_id", WHOLE, nullable=False),
        sa.ForeignKeyConstraint(["reading_id"], ["readings.id"], name=op.f("fk_ripe_reading_id")),
        sa.ForeignKeyConstraint(["stream_id"], ["streams.id"], name=op.f("fk_ripe_stream_id")),
        sa.PrimaryKeyConstraint("stream_id", "key", name=op.f("pk_ripe")),
        sqlite_strict=True,
    )


def _shifts() -> None:
    op.create_table(
        "shifts",
        sa.Column("id", TEXT, nullable=False),
        sa.Column("stream_id", TEXT, nullable=False),
        sa.Column("origin", TEXT, nullable=False),
        sa.Column("state", TEXT, nullable=False),
        sa.Column("announced_key", TEXT, nullable=False),
        sa.Column("announced_position", WHOLE, nullable=False),
        sa.Column("announced_at", TEXT, nullable=False),
        sa.Column("announced_utc", TEXT, nullable=False),
        sa.Column("start_key", TEXT, nullable=False),
        sa.Column("start_position", WHOLE, nullable=False),
        sa.Column("start_at", TEXT, nullable=False),
        sa.Column("region_first", WHOLE, nullable=False),
        sa.Column("region_last", WHOLE, nullable=False),
        sa.Column("region", TEXT, nullable=False),
        sa.Column("probability", REAL, nullable=False),
        sa.Column("level_before_low", REAL, nullable=False),
        sa.Column("level_before_mid", REAL, nullable=False),
        sa.Column("level_before_high", REAL, nullable=False),
        sa.Column("level_after_low", REAL, nullable=False),
        sa.Column("level_after_mid", REAL, nullable=False),
        sa.Column("level_after_high", REAL, nullable=False),
        sa.Column("late", WHOLE, nullable=False),
        sa.Column("fingerprint", TEXT, nullable=False),
        sa.Column("reading_id", WHOLE, nullable=True),
        sa.Column("told_utc", TEXT, nullable=True),
        sa.Column("told_how", TEXT, nullable=True),
        sa.Column("figures", TEXT, nullable=False),
        sa.CheckConstraint("origin IN ('live', 'history')", name=op.f("ck_shifts_origin")),
        sa.CheckConstraint("state IN ('emerging', 'settled', 'withdrawn')", name=op.f("ck_shifts_state")),
        sa.CheckConstraint("late IN (0, 1)", name=op.f("ck_shifts_late")),
        sa.ForeignKeyConstraint(["reading_id"], ["readings.id"], name=op.f("fk_shifts_reading_id")),
        sa.ForeignKeyConstraint(["stream_id"], ["streams.id"], name=op.f("fk_shifts_stream_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_shifts")),
        sqlite_strict=True,
    )
    op.create_index(
        op.f("ix_shifts_stream_id_announced_position"),
        "shifts",
        ["stream_id", "announced_position"],
        unique=False,
    )
    op.create_index(
        "ix_shifts_untold",
        "shifts",
        ["announced_utc"],
        unique=False,
        sqlite_where=sa.text("told_utc IS NULL"),
        postgresql_where=sa.text("told_utc IS NULL"),
    )


def _deliveries() -> None:
    op.create_table(
        "deliveries",
        sa.Column("id", TEXT, nullable=False),
        sa.Column("outlet", TEXT, nullable=False),
        sa.Column("shift_id", TEXT, nullable=True),
        sa.Column("body", BYTES, nullable=False),
        sa.Column("created_utc", TEXT, nullable=False),
        sa.Column("due_utc", TEXT, nullable=False),
        sa.Column("state", TEXT, nullable=False),
        sa.Column("attempts", WHOLE, nullable=False),
        sa.Column("last_status", WHOLE, nullable=True),
        sa.Column("last_error", TEXT, nullable=True),
        sa.CheckConstraint("state IN ('waiting', 'delivered', 'given_up')", name=op.f("ck_deliveries_state")),
        sa.ForeignKeyConstraint(["shift_id"], ["shifts.id"], name=op.f("fk_deliveries_shift_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_deliveries")),
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_deliveries_shift_id"), "deliveries", ["shift_id"], unique=False)
    op.create_index(op.f("ix_deliveries_state_due_utc"), "deliveries", ["state", "due_utc"], unique=False)


def _attempts() -> None:
    op.create_table(
        "attempts",
        sa.Column("id", WHOLE, autoincrement=True, nullable=False),
        sa.Column("delivery_id", TEXT, nullable=False),
        sa.Column("at_utc", TEXT, nullable=False),
        sa.Column("outcome", TEXT, nullable=False),
        sa.Column("status", WHOLE, nullable=True),
        sa.Column("error", TEXT, nullable=True),
        sa.Column("took_seconds", REAL, nullable=False),
        sa.ForeignKeyConstraint(["delivery_id"], ["deliveries.id"], name=op.f("fk_attempts_delivery_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_attempts")),
        sqlite_autoincrement=True,
        sqlite_strict=True,
    )
    op.create_index(op.f("ix_attempts_delivery_id_id"), "attempts", ["delivery_id", "id"], unique=False)
