"""Tables of the register. Times are UTC text (ISO 8601), dates YYYY-MM-DD, documents JSON text.

`revisions` and `events` only grow: triggers made by the migrations refuse to change what a revision
holds and to change or remove an event.
"""

from __future__ import annotations

import sqlalchemy as sa

__all__ = [
    "METADATA",
    "TABLES_IN_ORDER",
    "attempts",
    "decisions",
    "events",
    "eyewear",
    "lasers",
    "matches",
    "reevaluated",
    "reevaluations",
    "replies",
    "revisions",
    "sessions",
    "tokens",
    "users",
]

METADATA = sa.MetaData(
    naming_convention={
        "ix": "ix_%(table_name)s_%(column_0_name)s",
        "uq": "uq_%(table_name)s_%(column_0_name)s",
        "fk": "fk_%(table_name)s_%(column_0_name)s",
        "pk": "pk_%(table_name)s",
    }
)


def _text(name: str, length: int, *more: sa.schema.SchemaItem, **options: bool) -> sa.Column[str]:
    options.setdefault("nullable", False)
    return sa.Column(name, sa.String(length), *more, **options)  # type: ignore[arg-type]


def _id() -> sa.Column[int]:
    return sa.Column("id", sa.Integer, primary_key=True, autoincrement=True)


lasers = sa.Table(
    "lasers",
    METADATA,
    _id(),
    _text("asset_tag", 60, unique=True),
    _text("label", 200),
    _text("place", 200),
    _text("owner", 200),
    _text("manufacturer", 200),
    _text("searchable", 1000),
    _text("status", 12, index=True),
    sa.Column("version", sa.Integer, nullable=False),
    sa.Column("revision", sa.Integer, nullable=False),
    sa.Column("approved_revision", sa.Integer),
    _text("review_due", 10, nullable=True, index=True),
    _text("created_at", 32),
    _text("updated_at", 32),
    # Of the current revision, for lists.
    _text("rules_id", 100),
    _text("tables_digest", 80, index=True),
    _text("hazard_class", 10, index=True),
    sa.Column("class_rank", sa.Integer, nullable=False),
    sa.Column("eye_distance_m", sa.Double),
    sa.Column("skin_distance_m", sa.Double),
    sa.Column("optical_density", sa.Double, nullable=False),
    _text("wavelengths_nm", 400),
)
revisions = sa.Table(
    "revisions",
    METADATA,
    _id(),
    sa.Column("laser_id", sa.ForeignKey("lasers.id"), nullable=False),
    sa.Column("number", sa.Integer, nullable=False),
    _text("state", 12),
    sa.Column("request", sa.Text, nullable=False),
    _text("request_digest", 80),
    sa.Column("figures", sa.Text, nullable=False),
    sa.Column("result", sa.LargeBinary),
    _text("result_digest", 80, nullable=True),
    sa.Column("tables", sa.Text, nullable=False),
    _text("service_version", 40),
    _text("reason", 500),
    _text("created_at", 32),
    _text("created_by", 100),
    sa.UniqueConstraint("laser_id", "number"),
)
decisions = sa.Table(
    "decisions",
    METADATA,
    _id(),
    sa.Column("revision_id", sa.ForeignKey("revisions.id"), nullable=False, index=True),
    _text("action", 12),
    _text("by", 100),
    _text("at", 32),
    _text("comment", 2000),
)
events = sa.Table(
    "events",
    METADATA,
    _id(),
    _text("at", 32),
    _text("actor", 100),
    _text("via", 20),
    _text("action", 40),
    _text("subject", 20, index=True),
    sa.Column("subject_id", sa.Integer, nullable=False),
    sa.Column("detail", sa.Text, nullable=False),
    _text("previous", 64),
    _text("digest", 64),
)
eyewear = sa.Table(
    "eyewear",
    METADATA,
    _id(),
    _text("tag", 60, unique=True),
    sa.Column("pair", sa.Text, nullable=False),
    sa.Column("quantity", sa.Integer, nullable=False),
    _text("place", 200),
    _text("inspection_due", 10, nullable=True),
    sa.Column("retired", sa.Boolean, nullable=False),
    sa.Column("version", sa.Integer, nullable=False),
    _text("created_at", 32),
    _text("updated_at", 32),
)
#: What a pair does for a revision; a cache that may be emptied at any time.
matches = sa.Table(
    "matches",
    METADATA,
    sa.Column("revision_id", sa.ForeignKey("revisions.id"), primary_key=True),
    sa.Column("eyewear_id", sa.ForeignKey("eyewear.id"), primary_key=True, index=True),
    sa.Column("eyewear_version", sa.Integer, nullable=False),
    _text("tables_digest", 80),
    sa.Column("sufficient", sa.Boolean, nullable=False),
    sa.Column("verdict", sa.Text, nullable=False),
)
users = sa.Table(
    "users",
    METADATA,
    _id(),
    _text("name", 100, unique=True),
    _text("role", 12),
    _text("password", 300, nullable=True),
    sa.Column("active", sa.Boolean, nullable=False),
    sa.Column("version", sa.Integer, nullable=False),
    _text("created_at", 32),
)
sessions = sa.Table(
    "sessions",
    METADATA,
    _text("digest", 64, primary_key=True),
    sa.Column("user_id", sa.ForeignKey("users.id"), nullable=False, index=True),
    _text("created_at", 32),
    _text("expires_at", 32),
)
tokens = sa.Table(
    "tokens",
    METADATA,
    _id(),
    sa.Column("user_id", sa.ForeignKey("users.id"), nullable=False, index=True),
    _text("name", 100),
    _text("digest", 64, unique=True),
    _text("scope", 12),
    _text("created_at", 32),
    _text("expires_at", 32, nullable=True),
    _text("revoked_at", 32, nullable=True),
)
#: Failed sign-ins by user name and by address.
attempts = sa.Table(
    "attempts",
    METADATA,
    _text("key", 200, primary_key=True),
    sa.Column("failures", sa.Integer, nullable=False),
    _text("last_at", 32),
)
#: Answers kept for the same Idempotency-Key.
replies = sa.Table(
    "replies",
    METADATA,
    _text("actor", 100, primary_key=True),
    _text("key", 200, primary_key=True),
    _text("request_digest", 80),
    sa.Column("body", sa.Text, nullable=False),
    _text("location", 200),
    _text("created_at", 32),
)
reevaluations = sa.Table(
    "reevaluations",
    METADATA,
    _id(),
    _text("started_at", 32),
    _text("beat_at", 32),
    _text("ended_at", 32, nullable=True),
    _text("by", 100),
    _text("state", 12),
    sa.Column("total", sa.Integer, nullable=False),
    sa.Column("done", sa.Integer, nullable=False),
    _text("tables_digest", 80),
    _text("service_version", 40),
    _text("error", 500),
)
reevaluated = sa.Table(
    "reevaluated",
    METADATA,
    sa.Column("run_id", sa.ForeignKey("reevaluations.id"), primary_key=True),
    sa.Column("laser_id", sa.ForeignKey("lasers.id"), primary_key=True),
    sa.Column("revision", sa.Integer, nullable=False),
    sa.Column("old", sa.Text, nullable=False),
    sa.Column("new", sa.Text, nullable=False),
    sa.Column("adopted", sa.Boolean, nullable=False),
)

TABLES_IN_ORDER = tuple(METADATA.sorted_tables)
