"""Rows of the register as the models that leave it."""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping
from typing import Any

import sqlalchemy as sa

from service.contract.problem import NotFound
from service.register.clock import today
from service.register.figures import tables_digest, unpacked
from service.register.models import Decision, Figures, Laser, LaserSummary, Revision, RevisionDocument
from service.register.schema import decisions, lasers, revisions

__all__ = [
    "MOST",
    "history",
    "laser",
    "laser_row",
    "revision_document",
    "revision_row",
    "summary",
    "tables_current",
]

Row = Mapping[str, Any]
#: The highest id that the tables hold.
MOST = 2**31 - 1
AS_STORED = (
    *("id", "asset_tag", "label", "place", "owner", "manufacturer", "status"),
    *("version", "revision", "approved_revision", "review_due"),
)


def tables_current(row: Row) -> bool:
    """Whether the figures of a laser were made with the tables that are in use."""
    try:
        return bool(row["tables_digest"] == tables_digest(row["rules_id"]))
    except KeyError:
        return False


def summary(row: Row) -> LaserSummary:
    """A row of `lasers` for a list."""
    due = row["review_due"]
    return LaserSummary(
        **{name: row[name] for name in AS_STORED},
        overdue=due is not None and due < today() and row["status"] != "retired",
        created_at=row["created_at"],
        updated_at=row["updated_at"],
        rules=row["rules_id"],
        hazard_class=row["hazard_class"],
        eye_hazard_distance_m=row["eye_distance_m"],
        skin_hazard_distance_m=row["skin_distance_m"],
        optical_density=row["optical_density"],
        wavelengths_nm=row["wavelengths_nm"],
        tables_current=tables_current(row),
    )


def laser_row(connection: sa.Connection, laser_id: int) -> Row:
    """The row of a laser. Raises NotFound."""
    if laser_id > MOST:
        raise NotFound(f"there is no laser {laser_id} in the register")
    row = connection.execute(sa.select(lasers).where(lasers.c.id == laser_id)).mappings().first()
    if row is None:
        raise NotFound(f"there is no laser {laser_id} in the register")
    return dict(row)


def revision_row(connection: sa.Connection, laser_id: int, number: int) -> Row:
    """The row of a revision. Raises NotFound."""
    if max(laser_id, number) > MOST:
        raise NotFound(f"laser {laser_id} has no revision {number}")
    query = sa.select(revisions).where(revisions.c.laser_id == laser_id, revisions.c.number == number)
    row = connection.execute(query).mappings().first()
    if row is None:
        raise NotFound(f"laser {laser_id} has no revision {number}")
    return dict(row)


def laser(connection: sa.Connection, laser_id: int) -> Laser:
    """A laser with its current revision. Raises NotFound."""
    row = laser_row(connection, laser_id)
    current = revision_row(connection, laser_id, row["revision"])
    return Laser(
        **summary(row).model_dump(),
        request=json.loads(current["request"]),
        current=_revision(current, _decisions(connection, [current["id"]])),
    )


def history(connection: sa.Connection, laser_id: int) -> list[Revision]:
    """Every revision of a laser, the newest first. Raises NotFound."""
    laser_row(connection, laser_id)
    columns = [c for c in revisions.c if c.name not in ("result", "request")]
    query = sa.select(*columns).where(revisions.c.laser_id == laser_id).order_by(revisions.c.number.desc())
    rows = [dict(r) for r in connection.execute(query).mappings()]
    steps = _decisions(connection, [r["id"] for r in rows])
    return [_revision(r, steps) for r in rows]


def revision_document(connection: sa.Connection, laser_id: int, number: int) -> RevisionDocument:
    """A revision with request and result. Raises NotFound."""
    row = revision_row(connection, laser_id, number)
    return RevisionDocument(
        **_revision(row, _decisions(connection, [row["id"]])).model_dump(),
        request=json.loads(row["request"]),
        result=None if row["result"] is None else json.loads(unpacked(row["result"])),
    )


def _revision(row: Row, steps: dict[int, list[Decision]]) -> Revision:
    plain = ("number", "state", "created_at", "created_by", "reason", "service_version")
    return Revision(
        **{name: row[name] for name in plain},
        tables=json.loads(row["tables"]),
        request_digest=row["request_digest"],
        result_digest=row["result_digest"],
        figures=Figures.model_validate_json(row["figures"]),
        decisions=steps.get(row["id"], []),
    )


def _decisions(connection: sa.Connection, revision_ids: Iterable[int]) -> dict[int, list[Decision]]:
    query = sa.select(decisions).where(decisions.c.revision_id.in_(revision_ids)).order_by(decisions.c.id)
    found: dict[int, list[Decision]] = {}
    for row in connection.execute(query).mappings():
        step = Decision(action=row["action"], by=row["by"], at=row["at"], comment=row["comment"])
        found.setdefault(row["revision_id"], []).append(step)
    return found
