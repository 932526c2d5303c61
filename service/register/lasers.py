"""Lasers: stored, changed, never overwritten.

Every change of the evaluation request makes a new revision; a change of identity (place, owner, ...)
raises the version and stands in the audit log with old and new.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import Any

import sqlalchemy as sa

from service import __version__
from service.contract.problem import InvalidRequest
from service.contract.request import EvaluationRequest
from service.register.actor import Actor
from service.register.audit import Entry, record_all
from service.register.clock import now
from service.register.figures import (
    Kept,
    canonical,
    class_rank,
    digest_of,
    packed,
    request_from,
    tables_digest,
    tables_of,
)
from service.register.figures import kept as evaluate_kept
from service.register.models import Figures, LaserIn
from service.register.problems import Conflict, StaleVersion, field_error
from service.register.schema import lasers, revisions
from service.register.stored import laser_row, revision_row

__all__ = [
    "IDENTITY",
    "create",
    "create_all",
    "expect_version",
    "find_tag",
    "new_revision",
    "prepared",
    "update",
]

IDENTITY = ("asset_tag", "label", "place", "owner", "manufacturer", "review_due")
Row = dict[str, Any]


def find_tag(connection: sa.Connection, asset_tag: str) -> int | None:
    """Id of the laser with this inventory number."""
    found = connection.execute(sa.select(lasers.c.id).where(lasers.c.asset_tag == asset_tag)).scalar()
    return None if found is None else int(found)


def expect_version(row: Any, version: int | None) -> None:
    """Raises StaleVersion where the record is no longer the one that was read; None = any."""
    if version is not None and row["version"] != version:
        raise StaleVersion(
            f"version {version} was read, but the record is at version {row['version']}. Read it again."
        )


def prepared(connection: sa.Connection, laser_id: int, version: int | None, body: LaserIn) -> Kept:
    """What `update` is to store: evaluated anew only where the request differs from the stored one.

    Raises NotFound, and StaleVersion before anything is computed.
    """
    row = laser_row(connection, laser_id)
    expect_version(row, version)
    if version is not None:
        current = revision_row(connection, laser_id, row["revision"])
        if _same_setup(current, body.asked):
            return Kept(body.asked, Figures.model_validate_json(current["figures"]), None)
    return evaluate_kept(body.asked)


def _same_setup(current: Any, request: EvaluationRequest) -> bool:
    """Whether a revision holds this request; another name is no other setup."""
    return request_from(current["request"]).model_copy(update={"label": request.label}) == request


def create(connection: sa.Connection, actor: Actor, body: LaserIn, kept: Kept) -> int:
    """Store a new laser as a draft; its id. Raises Conflict where the inventory number is taken."""
    taken = find_tag(connection, body.asset_tag)
    if taken is not None:
        raise Conflict(f"the asset tag {body.asset_tag!r} is taken by laser {taken}")
    return create_all(connection, actor, [(body, kept)])[0]


def create_all(connection: sa.Connection, actor: Actor, new: Sequence[tuple[LaserIn, Kept]]) -> list[int]:
    """Store new lasers whose inventory numbers are free; their ids in order."""
    if not new:
        return []
    at = now()
    rows = [
        {
            **_identity(body),
            **_figures(kept),
            "status": "draft",
            "version": 1,
            "revision": 1,
            "created_at": at,
            "updated_at": at,
        }
        for body, kept in new
    ]
    insert = sa.insert(lasers).returning(lasers.c.id, sort_by_parameter_order=True)
    ids = [int(i) for i in connection.execute(insert, rows).scalars()]
    pairs = list(zip(ids, new, strict=True))
    connection.execute(
        sa.insert(revisions),
        [_revision(i, 1, kept, actor, body.reason or "first entry", at) for i, (body, kept) in pairs],
    )
    entries = [
        Entry("laser created", "laser", i, {**_told(_identity(body)), "revision": 1, **_told_figures(kept)})
        for i, (body, kept) in pairs
    ]
    record_all(connection, actor, entries)
    return ids


def update(
    connection: sa.Connection,
    actor: Actor,
    laser_id: int,
    version: int | None,
    body: LaserIn,
    kept: Kept,
) -> bool:
    """Replace identity and request; false where nothing differs.

    Raises NotFound, StaleVersion, and Conflict for a retired laser, a revision that awaits a decision
    or an inventory number of another laser.
    """
    row = laser_row(connection, laser_id)
    expect_version(row, version)
    identity = _identity(body)
    old = {k: row[k] for k in IDENTITY}
    changed = {k: {"from": old[k], "to": identity[k]} for k in IDENTITY if old[k] != identity[k]}
    current = revision_row(connection, laser_id, row["revision"])
    same = _same_setup(current, kept.request)
    if not changed and same:
        return False
    if row["status"] == "retired":
        raise Conflict(f"laser {row['asset_tag']!r} is retired; reinstate it first")
    if "asset_tag" in changed:
        taken = find_tag(connection, body.asset_tag)
        if taken is not None:
            raise Conflict(f"the asset tag {body.asset_tag!r} is taken by laser {taken}")
    entries = []
    if changed:
        entries.append(Entry("laser changed", "laser", laser_id, {"changed": changed}))
    values: Row = {**identity, "version": row["version"] + 1, "updated_at": now()}
    if not same:
        values |= new_revision(connection, actor, row, kept, body.reason, entries)
    connection.execute(sa.update(lasers).where(lasers.c.id == laser_id).values(values))
    record_all(connection, actor, entries)
    return True


def new_revision(
    connection: sa.Connection, actor: Actor, row: Any, kept: Kept, reason: str, entries: list[Entry]
) -> Row:
    """Add the next revision of a laser, a draft; what changes in `lasers`. Its entry joins `entries`.

    Raises Conflict where the current revision awaits a decision.
    """
    if row["status"] == "submitted":
        raise Conflict(
            f"revision {row['revision']} of {row['asset_tag']!r} awaits a decision; decide or withdraw it"
        )
    number = row["revision"] + 1
    current = sa.and_(revisions.c.laser_id == row["id"], revisions.c.number == row["revision"])
    connection.execute(
        sa.update(revisions).where(current, revisions.c.state != "approved").values(state="superseded")
    )
    connection.execute(sa.insert(revisions), [_revision(row["id"], number, kept, actor, reason, now())])
    detail = {"revision": number, "reason": reason, **_told_figures(kept)}
    entries.append(Entry("revision added", "laser", row["id"], detail))
    return {**_figures(kept), "revision": number, "status": "draft"}


def _identity(body: LaserIn) -> Row:
    found = {
        "asset_tag": body.asset_tag,
        "label": body.name,
        "place": body.place,
        "owner": body.owner,
        "manufacturer": body.manufacturer,
        "review_due": body.review_due,
    }
    searched = (found[k] or "" for k in ("asset_tag", "label", "place", "owner", "manufacturer"))
    return {**found, "searchable": "\n".join(searched).lower()[:1000]}


def _told(identity: Row) -> Row:
    return {k: v for k, v in identity.items() if k in IDENTITY and v}


def _told_figures(kept: Kept) -> Row:
    figures = kept.figures
    return {
        "hazard_class": figures.hazard_class,
        "eye_hazard_distance_m": figures.eye_hazard_distance_m,
        "optical_density": figures.optical_density,
    }


def _figures(kept: Kept) -> Row:
    figures = kept.figures
    waves = ", ".join(f"{w:.10g}" for w in figures.wavelengths_nm)
    return {
        "rules_id": figures.rules,
        "tables_digest": tables_digest(figures.rules),
        "hazard_class": figures.hazard_class,
        "class_rank": class_rank(figures.hazard_class),
        "eye_distance_m": figures.worst_eye_distance_m,
        "skin_distance_m": figures.worst_skin_distance_m,
        "optical_density": figures.worst_density,
        "wavelengths_nm": waves,
    }


def _revision(laser_id: int, number: int, kept: Kept, actor: Actor, reason: str, at: str) -> Row:
    request = canonical(kept.request.model_dump(mode="json", exclude_none=True))
    if len(request) > 200_000:
        error = field_error("request", None, "200000 characters", "the request is too long", "Shorten it.")
        raise InvalidRequest("request: too long", [error])
    return {
        "laser_id": laser_id,
        "number": number,
        "state": "draft",
        "request": request,
        "request_digest": digest_of(request),
        "figures": canonical(json.loads(kept.figures.model_dump_json())),
        "result": None if kept.result is None else packed(kept.result),
        "result_digest": None if kept.result is None else digest_of(kept.result),
        "tables": canonical(tables_of(kept.request.rules)),
        "service_version": __version__,
        "reason": reason,
        "created_at": at,
        "created_by": actor.name,
    }
