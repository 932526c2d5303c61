"""The first tables, and the triggers that keep revisions and events as they are."""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

__all__ = ["down_revision", "revision", "upgrade"]

revision = "r0001"
down_revision = None

#: What a revision holds stays; its result may be added once.
HELD = (
    *("laser_id", "number", "request", "request_digest", "figures", "tables"),
    *("service_version", "created_at", "created_by"),
)
SQLITE = (
    "CREATE TRIGGER events_stay BEFORE UPDATE ON events BEGIN SELECT RAISE(ABORT, 'events stay'); END",
    "CREATE TRIGGER events_kept BEFORE DELETE ON events BEGIN SELECT RAISE(ABORT, 'events stay'); END",
    "CREATE TRIGGER revisions_kept BEFORE DELETE ON revisions "
    "BEGIN SELECT RAISE(ABORT, 'revisions stay'); END",
    f"CREATE TRIGGER revisions_stay BEFORE UPDATE OF {', '.join(HELD)} ON revisions "
    "BEGIN SELECT RAISE(ABORT, 'revisions stay'); END",
    "CREATE TRIGGER results_stay BEFORE UPDATE OF result, result_digest ON revisions "
    "WHEN OLD.result IS NOT NULL BEGIN SELECT RAISE(ABORT, 'revisions stay'); END",
)
POSTGRESQL = (
    "CREATE FUNCTION register_stays() RETURNS trigger LANGUAGE plpgsql AS "
    "$$ BEGIN RAISE EXCEPTION '% stay', TG_TABLE_NAME; END $$",
    "CREATE TRIGGER events_stay BEFORE UPDATE OR DELETE OR TRUNCATE ON events "
    "FOR EACH STATEMENT EXECUTE FUNCTION register_stays()",
    "CREATE TRIGGER revisions_kept BEFORE DELETE OR TRUNCATE ON revisions "
    "FOR EACH STATEMENT EXECUTE FUNCTION register_stays()",
    f"CREATE TRIGGER revisions_stay BEFORE UPDATE OF {', '.join(HELD)} ON revisions "
    "FOR EACH STATEMENT EXECUTE FUNCTION register_stays()",
    "CREATE TRIGGER results_stay BEFORE UPDATE OF result, result_digest ON revisions "
    "FOR EACH ROW WHEN (OLD.result IS NOT NULL) EXECUTE FUNCTION register_stays()",
)


def upgrade() -> None:
    """Make every table and trigger."""
    op.create_table(
        "attempts",
        sa.Column("key", sa.String(length=200), nullable=False),
        sa.Column("failures", sa.Integer(), nullable=False),
        sa.Column("last_at", sa.String(length=32), nullable=False),
        sa.PrimaryKeyConstraint("key", name=op.f("pk_attempts")),
    )
    op.create_table(
        "events",
        sa.Column("id", sa.Integer(), autoincrement=True, nullable=False),
        sa.Column("at", sa.String(length=32), nullable=False),
        sa.Column("actor", sa.String(length=100), nullable=False),
        sa.Column("via", sa.String(length=20), nullable=False),
        sa.Column("action", sa.String(length=40), nullable=False),
        sa.Column("subject", sa.String(length=20), nullable=False),
        sa.Column("subject_id", sa.Integer(), nullable=False),
        sa.Column("detail", sa.Text(), nullable=False),
        sa.Column("previous", sa.String(length=64), nullable=False),
        sa.Column("digest", sa.String(length=64), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_events")),
    )
    op.create_index(op.f("ix_events_subject"), "events", ["subject"], unique=False)
    op.create_table(
        "eyewear",
        sa.Column("id", sa.Integer(), autoincrement=True, nullable=False),
        sa.Column("tag", sa.String(length=60), nullable=False),
        sa.Column("pair", sa.Text(), nullable=False),
        sa.Column("quantity", sa.Integer(), nullable=False),
        sa.Column("place", sa.String(length=200), nullable=False),
        sa.Column("inspection_due", sa.String(length=10), nullable=True),
        sa.Column("retired", sa.Boolean(), nullable=False),
        sa.Column("version", sa.Integer(), nullable=False),
        sa.Column("created_at", sa.String(length=32), nullable=False),
        sa.Column("updated_at", sa.String(length=32), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_eyewear")),
        sa.UniqueConstraint("tag", name=op.f("uq_eyewear_tag")),
    )
    op.create_table(
        "lasers",
        sa.Column("id", sa.Integer(), autoincrement=True, nullable=False),
        sa.Column("asset_tag", sa.String(length=60), nullable=False),
        sa.Column("label", sa.String(length=200), nullable=False),
        sa.Column("place", sa.String(length=200), nullable=False),
        sa.Column("owner", sa.String(length=200), nullable=False),
        sa.Column("manufacturer", sa.String(length=200), nullable=False),
        sa.Column("searchable", sa.String(length=1000), nullable=False),
        sa.Column("status", sa.String(length=12), nullable=False),
        sa.Column("version", sa.Integer(), nullable=False),
        sa.Column("revision", sa.Integer(), nullable=False),
        sa.Column("approved_revision", sa.Integer(), nullable=True),
        sa.Column("review_due", sa.String(length=10), nullable=True),
        sa.Column("created_at", sa.String(length=32), nullable=False),
        sa.Column("updated_at", sa.String(length=32), nullable=False),
        sa.Column("rules_id", sa.String(length=100), nullable=False),
        sa.Column("tables_digest", sa.String(length=80), nullable=False),
        sa.Column("hazard_class", sa.String(length=10), nullable=False),
        sa.Column("class_rank", sa.Integer(), nullable=False),
        sa.Column("eye_distance_m", sa.Double(), nullable=True),
        sa.Column("skin_distance_m", sa.Double(), nullable=True),
        sa.Column("optical_density", sa.Double(), nullable=False),
        sa.Column("wavelengths_nm", sa.String(length=400), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_lasers")),
        sa.UniqueConstraint("asset_tag", name=op.f("uq_lasers_asset_tag")),
    )
    op.create_index(op.f("ix_lasers_hazard_class"), "lasers", ["hazard_class"], unique=False)
    op.create_index(op.f("ix_lasers_review_due"), "lasers", ["review_due"], unique=False)
    op.create_index(op.f("ix_lasers_status"), "lasers", ["status"], unique=False)
    op.create_index(op.f("ix_lasers_tables_digest"), "lasers", ["tables_digest"], unique=False)
    op.create_table(
        "reevaluations",
        sa.Column("id", sa.Integer(), autoincrement=True, nullable=False),
        sa.Column("started_at", sa.String(length=32), nullable=False),
        sa.Column("beat_at", sa.String(length=32), nullable=False),
        sa.Column("ended_at", sa.String(length=32), nullable=True),
        sa.Column("by", sa.String(length=100), nullable=False),
        sa.Column("state", sa.String(length=12), nullable=False),
        sa.Column("total", sa.Integer(), nullable=False),
        sa.Column("done", sa.Integer(), nullable=False),
        sa.Column("tables_digest", sa.String(length=80), nullable=False),
        sa.Column("service_version", sa.String(length=40), nullable=False),
        sa.Column("error", sa.String(length=500), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_reevaluations")),
    )
    op.create_table(
        "replies",
        sa.Column("actor", sa.String(length=100), nullable=False),
        sa.Column("key", sa.String(length=200), nullable=False),
        sa.Column("request_digest", sa.String(length=80), nullable=False),
        sa.Column("body", sa.Text(), nullable=False),
        sa.Column("location", sa.String(length=200), nullable=False),
        sa.Column("created_at", sa.String(length=32), nullable=False),
        sa.PrimaryKeyConstraint("actor", "key", name=op.f("pk_replies")),
    )
    op.create_table(
        "users",
        sa.Column("id", sa.Integer(), autoincrement=True, nullable=False),
        sa.Column("name", sa.String(length=100), nullable=False),
        sa.Column("role", sa.String(length=12), nullable=False),
        sa.Column("password", sa.String(length=300), nullable=True),
        sa.Column("active", sa.Boolean(), nullable=False),
        sa.Column("version", sa.Integer(), nullable=False),
        sa.Column("created_at", sa.String(length=32), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_users")),
        sa.UniqueConstraint("name", name=op.f("uq_users_name")),
    )
    op.create_table(
        "reevaluated",
        sa.Column("run_id", sa.Integer(), nullable=False),
        sa.Column("laser_id", sa.Integer(), nullable=False),
        sa.Column("revision", sa.Integer(), nullable=False),
        sa.Column("old", sa.Text(), nullable=False),
        sa.Column("new", sa.Text(), nullable=False),
        sa.Column("adopted", sa.Boolean(), nullable=False),
        sa.ForeignKeyConstraint(["laser_id"], ["lasers.id"], name=op.f("fk_reevaluated_laser_id")),
        sa.ForeignKeyConstraint(["run_id"], ["reevaluations.id"], name=op.f("fk_reevaluated_run_id")),
        sa.PrimaryKeyConstraint("run_id", "laser_id", name=op.f("pk_reevaluated")),
    )
    op.create_table(
        "revisions",
        sa.Column("id", sa.Integer(), autoincrement=True, nullable=False),
        sa.Column("laser_id", sa.Integer(), nullable=False),
        sa.Column("number", sa.Integer(), nullable=False),
        sa.Column("state", sa.String(length=12), nullable=False),
        sa.Column("request", sa.Text(), nullable=False),
        sa.Column("request_digest", sa.String(length=80), nullable=False),
        sa.Column("figures", sa.Text(), nullable=False),
        sa.Column("result", sa.LargeBinary(), nullable=True),
        sa.Column("result_digest", sa.String(length=80), nullable=True),
        sa.Column("tables", sa.Text(), nullable=False),
        sa.Column("service_version", sa.String(length=40), nullable=False),
        sa.Column("reason", sa.String(length=500), nullable=False),
        sa.Column("created_at", sa.String(length=32), nullable=False),
        sa.Column("created_by", sa.String(length=100), nullable=False),
        sa.ForeignKeyConstraint(["laser_id"], ["lasers.id"], name=op.f("fk_revisions_laser_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_revisions")),
        sa.UniqueConstraint("laser_id", "number", name=op.f("uq_revisions_laser_id")),
    )
    op.create_table(
        "sessions",
        sa.Column("digest", sa.String(length=64), nullable=False),
        sa.Column("user_id", sa.Integer(), nullable=False),
        sa.Column("created_at", sa.String(length=32), nullable=False),
        sa.Column("expires_at", sa.String(length=32), nullable=False),
        sa.ForeignKeyConstraint(["user_id"], ["users.id"], name=op.f("fk_sessions_user_id")),
        sa.PrimaryKeyConstraint("digest", name=op.f("pk_sessions")),
    )
    op.create_index(op.f("ix_sessions_user_id"), "sessions", ["user_id"], unique=False)
    op.create_table(
        "tokens",
        sa.Column("id", sa.Integer(), autoincrement=True, nullable=False),
        sa.Column("user_id", sa.Integer(), nullable=False),
        sa.Column("name", sa.String(length=100), nullable=False),
        sa.Column("digest", sa.String(length=64), nullable=False),
        sa.Column("scope", sa.String(length=12), nullable=False),
        sa.Column("created_at", sa.String(length=32), nullable=False),
        sa.Column("expires_at", sa.String(length=32), nullable=True),
        sa.Column("revoked_at", sa.String(length=32), nullable=True),
        sa.ForeignKeyConstraint(["user_id"], ["users.id"], name=op.f("fk_tokens_user_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_tokens")),
        sa.UniqueConstraint("digest", name=op.f("uq_tokens_digest")),
    )
    op.create_index(op.f("ix_tokens_user_id"), "tokens", ["user_id"], unique=False)
    op.create_table(
        "decisions",
        sa.Column("id", sa.Integer(), autoincrement=True, nullable=False),
        sa.Column("revision_id", sa.Integer(), nullable=False),
        sa.Column("action", sa.String(length=12), nullable=False),
        sa.Column("by", sa.String(length=100), nullable=False),
        sa.Column("at", sa.String(length=32), nullable=False),
        sa.Column("comment", sa.String(length=2000), nullable=False),
        sa.ForeignKeyConstraint(["revision_id"], ["revisions.id"], name=op.f("fk_decisions_revision_id")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_decisions")),
    )
    op.create_index(op.f("ix_decisions_revision_id"), "decisions", ["revision_id"], unique=False)
    op.create_table(
        "matches",
        sa.Column("revision_id", sa.Integer(), nullable=False),
        sa.Column("eyewear_id", sa.Integer(), nullable=False),
        sa.Column("eyewear_version", sa.Integer(), nullable=False),
        sa.Column("tables_digest", sa.String(length=80), nullable=False),
        sa.Column("sufficient", sa.Boolean(), nullable=False),
        sa.Column("verdict", sa.Text(), nullable=False),
        sa.ForeignKeyConstraint(["eyewear_id"], ["eyewear.id"], name=op.f("fk_matches_eyewear_id")),
        sa.ForeignKeyConstraint(["revision_id"], ["revisions.id"], name=op.f("fk_matches_revision_id")),
        sa.PrimaryKeyConstraint("revision_id", "eyewear_id", name=op.f("pk_matches")),
    )
    op.create_index(op.f("ix_matches_eyewear_id"), "matches", ["eyewear_id"], unique=False)
    dialect = op.get_bind().dialect.name
    for statement in SQLITE if dialect == "sqlite" else POSTGRESQL:
        op.execute(sa.text(statement))
