"""Which pairs on the shelf will do for which lasers.

The verdict is that of the evaluation (`protection.eyewear`), for the current revision under the tables
in use. Verdicts are kept until the revision, the pair or a table changes.
"""

from __future__ import annotations

import json
import time
from collections.abc import Mapping
from typing import Any

import sqlalchemy as sa

from service.contract.answer import answer
from service.contract.request import MAX_PAIRS
from service.contract.result import Model
from service.register.clock import today
from service.register.database import Database
from service.register.figures import canonical, request_from, tables_digest
from service.register.models import LaserSummary
from service.register.schema import eyewear, lasers, matches, revisions
from service.register.shelf import pair_of, shelf_list, shelf_row
from service.register.stored import laser_row, summary

__all__ = ["Cover", "LaserMatch", "PairMatch", "fill", "lasers_for", "pairs_for", "without_eyewear"]

#: Seconds that one request may spend on verdicts that are not kept yet.
BUDGET_S = 3.0
#: Lasers looked at in one request.
AT_ONCE = 10_000


class PairMatch(Model):
    """A pair on the shelf against one laser."""

    eyewear_id: int
    tag: str
    name: str
    quantity: int
    place: str
    inspection_overdue: bool
    sufficient: bool
    dense_enough: bool
    resistance_shown: bool
    alignment_only: bool
    remaining_ratio: float
    missing: list[str]


class LaserMatch(Model):
    """A laser that a pair was held against."""

    laser: LaserSummary
    sufficient: bool
    remaining_ratio: float
    missing: list[str]


class Cover(Model):
    """Lasers that need eyewear, and those for which no pair on the shelf will do."""

    needing: int
    covered: int
    without: list[LaserSummary]
    unexamined: int = 0


def needing() -> sa.ColumnElement[bool]:
    """Condition: a laser in use that exceeds a limit of the eye."""
    return sa.and_(lasers.c.status != "retired", lasers.c.optical_density > 0.0)


def fill(database: Database, laser_ids: list[int], budget_s: float = BUDGET_S) -> list[int]:
    """Make the verdicts that are missing, within a budget of time; ids of lasers not reached."""
    laser_ids, beyond = laser_ids[:AT_ONCE], laser_ids[AT_ONCE:]
    with database.read() as connection:
        pairs = shelf_list(connection, in_use=True)
        current = sa.and_(revisions.c.laser_id == lasers.c.id, revisions.c.number == lasers.c.revision)
        query = (
            sa.select(lasers.c.id.label("laser_id"), lasers.c.rules_id, revisions.c.id, revisions.c.request)
            .join(revisions, current)
            .where(lasers.c.id.in_(laser_ids))
            .order_by(lasers.c.id)
        )
        targets = [dict(r) for r in connection.execute(query).mappings()]
        known = {
            (r.revision_id, r.eyewear_id): (r.eyewear_version, r.tables_digest)
            for r in connection.execute(
                sa.select(
                    matches.c.revision_id,
                    matches.c.eyewear_id,
                    matches.c.eyewear_version,
                    matches.c.tables_digest,
                ).where(matches.c.revision_id.in_([t["id"] for t in targets]))
            )
        }
    end, rows, left = time.monotonic() + budget_s, [], list(beyond)
    for target in targets:
        digest = tables_digest(target["rules_id"])
        missing = [p for p in pairs if known.get((target["id"], p["id"])) != (p["version"], digest)]
        if missing and time.monotonic() > end:
            left.append(target["laser_id"])
            continue
        for start in range(0, len(missing), MAX_PAIRS):
            rows += _verdicts(target, missing[start : start + MAX_PAIRS], digest)
    if rows:
        with database.write() as connection:
            for row in rows:
                same = [matches.c[k] == row[k] for k in ("revision_id", "eyewear_id")]
                connection.execute(sa.delete(matches).where(*same))
            connection.execute(sa.insert(matches), rows)
    return left


def _verdicts(target: Mapping[str, Any], pairs: list[Any], digest: str) -> list[dict[str, Any]]:
    request = request_from(target["request"])
    held = request.model_copy(update={"eyewear": [pair_of(p) for p in pairs], "windows": []})
    checks = answer(held).protection.eyewear
    return [
        {
            "revision_id": target["id"],
            "eyewear_id": pair["id"],
            "eyewear_version": pair["version"],
            "tables_digest": digest,
            "sufficient": check.sufficient,
            "verdict": canonical(
                {
                    "dense_enough": check.dense_enough,
                    "resistance_shown": check.resistance_shown,
                    "alignment_only": check.alignment_only,
                    "remaining_ratio": check.remaining_ratio,
                    "missing": [m for line in check.lines for m in line.missing],
                }
            ),
        }
        for pair, check in zip(pairs, checks, strict=True)
    ]


def pairs_for(database: Database, laser_id: int) -> list[PairMatch]:
    """Every pair in use against one laser, the sufficient ones first. Raises NotFound."""
    with database.read() as connection:
        laser_row(connection, laser_id)
    fill(database, [laser_id], budget_s=60.0)
    with database.read() as connection:
        query = _verdicts_of(lasers.c.id == laser_id)
        found = []
        for row in connection.execute(query).mappings():
            due = row["inspection_due"]
            found.append(
                PairMatch(
                    eyewear_id=row["eyewear_id"],
                    tag=row["tag"],
                    name=json.loads(row["pair"])["name"],
                    quantity=row["quantity"],
                    place=row["eyewear_place"],
                    inspection_overdue=due is not None and due < today(),
                    sufficient=row["sufficient"],
                    **json.loads(row["verdict"]),
                )
            )
    return sorted(found, key=lambda m: (not m.sufficient, m.inspection_overdue, m.remaining_ratio, m.tag))


def lasers_for(database: Database, eyewear_id: int) -> tuple[list[LaserMatch], int]:
    """Lasers that need eyewear against one pair; how many could not be looked at in time.

    Raises NotFound.
    """
    with database.read() as connection:
        shelf_row(connection, eyewear_id)
        ids = list(connection.execute(sa.select(lasers.c.id).where(needing())).scalars())
    left = set(fill(database, ids))
    with database.read() as connection:
        query = _verdicts_of(needing(), eyewear.c.id == eyewear_id)
        found = []
        for row in connection.execute(query).mappings():
            if row["id"] in left:
                continue
            verdict = json.loads(row["verdict"])
            found.append(
                LaserMatch(
                    laser=summary(dict(row)),
                    sufficient=row["sufficient"],
                    remaining_ratio=verdict["remaining_ratio"],
                    missing=verdict["missing"],
                )
            )
    return sorted(found, key=lambda m: (not m.sufficient, m.laser.asset_tag)), len(left)


def without_eyewear(database: Database) -> Cover:
    """Lasers that need eyewear and have none on the shelf that will do."""
    with database.read() as connection:
        rows = connection.execute(sa.select(lasers).where(needing()).order_by(lasers.c.asset_tag)).mappings()
        needed = [dict(r) for r in rows]
    left = set(fill(database, [r["id"] for r in needed]))
    with database.read() as connection:
        query = _verdicts_of(needing(), matches.c.sufficient.is_(True))
        covered = {r["id"] for r in connection.execute(query).mappings()}
    looked = [r for r in needed if r["id"] not in left]
    without = [summary(r) for r in looked if r["id"] not in covered]
    return Cover(
        needing=len(needed), covered=len(looked) - len(without), without=without, unexamined=len(left)
    )


def _verdicts_of(*conditions: sa.ColumnElement[bool]) -> sa.Select[Any]:
    """Lasers with their verdicts for pairs in use."""
    current = sa.and_(revisions.c.laser_id == lasers.c.id, revisions.c.number == lasers.c.revision)
    return (
        sa.select(
            lasers,
            matches.c.eyewear_id,
            matches.c.sufficient,
            matches.c.verdict,
            eyewear.c.tag,
            eyewear.c.pair,
            eyewear.c.quantity,
            eyewear.c.inspection_due,
            eyewear.c.place.label("eyewear_place"),
        )
        .join(revisions, current)
        .join(matches, matches.c.revision_id == revisions.c.id)
        .join(eyewear, eyewear.c.id == matches.c.eyewear_id)
        .where(eyewear.c.retired.is_(False), eyewear.c.quantity > 0, *conditions)
    )
