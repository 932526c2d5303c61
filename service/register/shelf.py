"""The eyewear shelf: pairs with markings, quantity, place and date of inspection."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any

import sqlalchemy as sa

from service.contract.problem import NotFound
from service.contract.request import Eyewear
from service.register.actor import Actor
from service.register.audit import Entry, record
from service.register.clock import now, today
from service.register.figures import canonical
from service.register.lasers import expect_version
from service.register.models import EyewearIn, EyewearRecord
from service.register.problems import Conflict
from service.register.schema import eyewear, matches
from service.register.stored import MOST

__all__ = ["add", "change", "pair_of", "record_of", "shelf_list", "shelf_row"]


def record_of(row: Mapping[str, Any]) -> EyewearRecord:
    """A row of `eyewear`."""
    due = row["inspection_due"]
    plain = ("id", "tag", "quantity", "place", "inspection_due", "retired", "version")
    return EyewearRecord(
        **{name: row[name] for name in plain},
        pair=json.loads(row["pair"]),
        inspection_overdue=due is not None and due < today() and not row["retired"],
        created_at=row["created_at"],
        updated_at=row["updated_at"],
    )


def pair_of(row: Mapping[str, Any]) -> Eyewear:
    """The pair as a request takes it."""
    return Eyewear.model_validate(json.loads(row["pair"]))


def shelf_row(connection: sa.Connection, eyewear_id: int) -> dict[str, Any]:
    """The row of a pair. Raises NotFound."""
    if eyewear_id > MOST:
        raise NotFound(f"there is no eyewear {eyewear_id} on the shelf")
    row = connection.execute(sa.select(eyewear).where(eyewear.c.id == eyewear_id)).mappings().first()
    if row is None:
        raise NotFound(f"there is no eyewear {eyewear_id} on the shelf")
    return dict(row)


def shelf_list(connection: sa.Connection, in_use: bool = False, after: int = 0, limit: int = 0) -> list[Any]:
    """Rows of the shelf by id; `in_use` leaves out retired and missing ones."""
    query = sa.select(eyewear).where(eyewear.c.id > after).order_by(eyewear.c.id)
    if in_use:
        query = query.where(eyewear.c.retired.is_(False), eyewear.c.quantity > 0)
    return [dict(r) for r in connection.execute(query.limit(limit) if limit else query).mappings()]


def add(connection: sa.Connection, actor: Actor, body: EyewearIn) -> int:
    """Put a pair on the shelf; its id. Raises Conflict where the tag is taken."""
    _free(connection, body.tag)
    at = now()
    values = {**_values(body), "version": 1, "created_at": at, "updated_at": at}
    found = connection.execute(sa.insert(eyewear).values(values).returning(eyewear.c.id)).scalar_one()
    record(connection, actor, Entry("eyewear added", "eyewear", found, body.model_dump(mode="json")))
    return int(found)


def change(
    connection: sa.Connection, actor: Actor, eyewear_id: int, version: int | None, body: EyewearIn
) -> bool:
    """Replace a pair; false where nothing differs. Raises NotFound, StaleVersion, Conflict."""
    row = shelf_row(connection, eyewear_id)
    expect_version(row, version)
    values = _values(body)
    changed = {k: {"from": row[k], "to": v} for k, v in values.items() if row[k] != v}
    if not changed:
        return False
    if "tag" in changed:
        _free(connection, body.tag)
    connection.execute(
        sa.update(eyewear)
        .where(eyewear.c.id == eyewear_id)
        .values(**values, version=row["version"] + 1, updated_at=now())
    )
    connection.execute(sa.delete(matches).where(matches.c.eyewear_id == eyewear_id))
    record(connection, actor, Entry("eyewear changed", "eyewear", eyewear_id, {"changed": changed}))
    return True


def _free(connection: sa.Connection, tag: str) -> None:
    taken = connection.execute(sa.select(eyewear.c.id).where(eyewear.c.tag == tag)).scalar()
    if taken is not None:
        raise Conflict(f"the tag {tag!r} is taken by eyewear {taken}")


def _values(body: EyewearIn) -> dict[str, Any]:
    return {
        "tag": body.tag,
        "pair": canonical(body.pair.model_dump(mode="json", exclude_none=True)),
        "quantity": body.quantity,
        "place": body.place,
        "inspection_due": body.inspection_due,
        "retired": body.retired,
    }
