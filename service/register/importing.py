"""Many lasers at once: all of them, or none."""

from __future__ import annotations

from collections.abc import Sequence

import sqlalchemy as sa

from service.contract.problem import FieldError, InvalidRequest
from service.contract.result import Model
from service.register.actor import Actor
from service.register.audit import Entry, record
from service.register.database import Database
from service.register.figures import Kept, evaluated
from service.register.lasers import IDENTITY, create_all, update
from service.register.models import LaserIn
from service.register.problems import Conflict, field_error
from service.register.schema import lasers
from service.register.stored import laser_row

__all__ = ["Imported", "import_all", "refusal"]

#: Asset tags looked up in one query.
TAGS = 500


class Imported(Model):
    """What an import did, or would do."""

    checked_only: bool
    created: int
    changed: int
    unchanged: int


class _Undo(Exception):
    """Ends a transaction that was for checking only."""


def refusal(errors: list[FieldError], count: int) -> InvalidRequest:
    """The problem of an import with errors."""
    more = f" ({count - 1} more)" if count > 1 else ""
    detail = f"{errors[0].field}: {errors[0].message}{more}. Nothing was imported."
    return InvalidRequest(detail, errors)


def import_all(
    database: Database, actor: Actor, bodies: Sequence[tuple[int, LaserIn]], check_only: bool = False
) -> Imported:
    """Create the lasers whose asset tag is new and change the others, in one transaction.

    `bodies` come with the number of their row; asset tags are unique among them. Raises InvalidRequest
    naming every row that cannot be stored; nothing is stored then.
    """
    found = evaluated([body.asked for _, body in bodies])
    result = Imported(checked_only=check_only, created=0, changed=0, unchanged=0)
    errors: list[FieldError] = []
    try:
        with database.write() as connection:
            known = _known(connection, [body.asset_tag for _, body in bodies])
            new = []
            for (row, body), kept in zip(bodies, found, strict=True):
                laser_id = known.get(body.asset_tag)
                if laser_id is None:
                    new.append((body, kept))
                    continue
                whole = _completed(connection, laser_id, body)
                try:
                    changed = update(
                        connection, actor, laser_id, None, whole, Kept(whole.asked, kept.figures, None)
                    )
                except Conflict as problem:
                    remedy = "Decide on the revision or reinstate the laser first, or leave the row out."
                    name = f"row {row}, asset_tag"
                    errors.append(
                        field_error(name, body.asset_tag, "a laser that can change", problem.detail, remedy)
                    )
                    continue
                result.changed += changed
                result.unchanged += not changed
            if errors:
                raise refusal(errors, len(errors))
            create_all(connection, actor, new)
            result.created = len(new)
            if check_only:
                raise _Undo
            detail = {"created": result.created, "changed": result.changed, "unchanged": result.unchanged}
            record(connection, actor, Entry("lasers imported", "register", 0, detail))
    except _Undo:
        pass
    return result


def _completed(connection: sa.Connection, laser_id: int, body: LaserIn) -> LaserIn:
    """A change with what it does not name as it is stored: a missing column clears nothing."""
    row = laser_row(connection, laser_id)
    return body.model_copy(update={n: row[n] for n in IDENTITY if n not in body.model_fields_set})


def _known(connection: sa.Connection, tags: list[str]) -> dict[str, int]:
    found: dict[str, int] = {}
    for start in range(0, len(tags), TAGS):
        query = sa.select(lasers.c.asset_tag, lasers.c.id).where(
            lasers.c.asset_tag.in_(tags[start : start + TAGS])
        )
        found.update((str(tag), int(i)) for tag, i in connection.execute(query))
    return found
