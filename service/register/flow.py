"""The way of a revision: draft, submitted, approved or returned; and of a laser: retired, reinstated."""

from __future__ import annotations

import json
from typing import Any

import sqlalchemy as sa

from service import __version__
from service.contract.problem import InvalidRequest
from service.register.actor import Actor
from service.register.audit import Entry, record, record_all
from service.register.clock import now
from service.register.figures import digest_of, kept, packed, request_from, tables_of, unpacked
from service.register.lasers import expect_version, new_revision
from service.register.models import DecisionIn
from service.register.problems import Conflict, Forbidden, field_error
from service.register.schema import decisions, lasers, revisions
from service.register.stored import laser_row, revision_row

__all__ = [
    "approve",
    "evaluate_anew",
    "reinstate",
    "retire",
    "return_",
    "review",
    "submit",
    "whole_result",
    "withdraw",
]


def whole_result(revision: Any) -> str | None:
    """The whole result of a revision as JSON text: the one kept, or made again with the same tables.

    None where it was not kept and tables or service have changed since.
    """
    if revision["result"] is not None:
        return unpacked(revision["result"])
    request = request_from(revision["request"])
    same = json.loads(revision["tables"]) == tables_of(request.rules)
    return kept(request).result if same and revision["service_version"] == __version__ else None


def submit(
    connection: sa.Connection, actor: Actor, laser_id: int, number: int, body: DecisionIn, version: int | None
) -> None:
    """Ask for a decision on the current draft; its whole result is kept from here on.

    Raises NotFound, StaleVersion, and Conflict where it is no draft or the tables have changed since.
    """
    row, revision = _current(connection, laser_id, number, version, ("draft", "returned"))
    if revision["result"] is None:
        result = whole_result(revision)
        if result is None:
            raise Conflict(
                f"revision {number} was evaluated with other tables, and its whole result was not kept; "
                "evaluate it anew first"
            )
        connection.execute(
            sa.update(revisions)
            .where(revisions.c.id == revision["id"])
            .values(result=packed(result), result_digest=digest_of(result))
        )
    _step(connection, actor, row, revision, "submitted", "submitted", "submitted", body.comment)


def withdraw(
    connection: sa.Connection, actor: Actor, laser_id: int, number: int, body: DecisionIn, version: int | None
) -> None:
    """Take a submitted revision back to draft. Raises as `submit`."""
    row, revision = _current(connection, laser_id, number, version, ("submitted",))
    _step(connection, actor, row, revision, "withdrawn", "draft", "draft", body.comment)


def approve(
    connection: sa.Connection,
    actor: Actor,
    laser_id: int,
    number: int,
    body: DecisionIn,
    version: int | None,
    four_eyes: bool = False,
) -> None:
    """Approve the submitted revision: it is in force and locked. Raises as `submit`.

    Raises Forbidden where four eyes are asked for and the actor submitted it.
    """
    row, revision = _current(connection, laser_id, number, version, ("submitted",))
    if four_eyes and _submitter(connection, revision["id"]) == actor.name:
        raise Forbidden("you submitted this revision; here somebody else has to approve it")
    earlier = sa.and_(revisions.c.laser_id == laser_id, revisions.c.state == "approved")
    connection.execute(sa.update(revisions).where(earlier).values(state="superseded"))
    more: dict[str, Any] = {"approved_revision": number}
    if body.review_due is not None:
        more["review_due"] = body.review_due
    _step(connection, actor, row, revision, "approved", "approved", "approved", body.comment, more)


def _submitter(connection: sa.Connection, revision_id: int) -> str:
    """Who submitted a revision last."""
    same = [decisions.c.revision_id == revision_id, decisions.c.action == "submitted"]
    query = sa.select(decisions.c.by).where(*same).order_by(decisions.c.id.desc()).limit(1)
    return str(connection.execute(query).scalar_one())


def return_(
    connection: sa.Connection, actor: Actor, laser_id: int, number: int, body: DecisionIn, version: int | None
) -> None:
    """Return the submitted revision with a comment. Raises as `submit`; InvalidRequest without one."""
    if not body.comment:
        error = field_error(
            "comment", None, "1 to 2000 characters", "a comment is needed", "Say what has to change."
        )
        raise InvalidRequest("comment: a comment is needed to return a revision", [error])
    row, revision = _current(connection, laser_id, number, version, ("submitted",))
    _step(connection, actor, row, revision, "returned", "returned", "draft", body.comment)


def evaluate_anew(
    connection: sa.Connection, actor: Actor, laser_id: int, reason: str, version: int | None
) -> None:
    """A new draft with the same request under the tables in use. Raises NotFound, StaleVersion, Conflict."""
    row = laser_row(connection, laser_id)
    expect_version(row, version)
    if row["status"] == "retired":
        raise Conflict(f"laser {row['asset_tag']!r} is retired; reinstate it first")
    request = request_from(revision_row(connection, laser_id, row["revision"])["request"])
    entries: list[Entry] = []
    values = new_revision(connection, actor, row, kept(request), reason, entries)
    values |= {"version": row["version"] + 1, "updated_at": now()}
    connection.execute(sa.update(lasers).where(lasers.c.id == laser_id).values(values))
    record_all(connection, actor, entries)


def retire(connection: sa.Connection, actor: Actor, laser_id: int, version: int | None) -> None:
    """Take a laser out of use; its history stays. Raises NotFound, StaleVersion, Conflict."""
    row = laser_row(connection, laser_id)
    expect_version(row, version)
    if row["status"] == "retired":
        raise Conflict(f"laser {row['asset_tag']!r} is retired already")
    if row["status"] == "submitted":
        raise Conflict(f"revision {row['revision']} awaits a decision; withdraw it first")
    _status(connection, actor, row, "retired", "laser retired")


def reinstate(connection: sa.Connection, actor: Actor, laser_id: int, version: int | None) -> None:
    """Take a retired laser into the register again. Nothing is in force until it is approved anew.

    Raises NotFound, StaleVersion, and Conflict where it is not retired.
    """
    row = laser_row(connection, laser_id)
    expect_version(row, version)
    if row["status"] != "retired":
        raise Conflict(f"laser {row['asset_tag']!r} is not retired")
    current = revision_row(connection, laser_id, row["revision"])
    if current["state"] == "approved":
        connection.execute(sa.update(revisions).where(revisions.c.id == current["id"]).values(state="draft"))
    earlier = sa.and_(revisions.c.laser_id == laser_id, revisions.c.state == "approved")
    connection.execute(sa.update(revisions).where(earlier).values(state="superseded"))
    _status(connection, actor, row, "draft", "laser reinstated", {"approved_revision": None})


def review(
    connection: sa.Connection, actor: Actor, laser_id: int, due: str | None, version: int | None
) -> None:
    """Set the date of the next review. Raises NotFound, StaleVersion."""
    row = laser_row(connection, laser_id)
    expect_version(row, version)
    if row["review_due"] == due:
        return
    values = {"review_due": due, "version": row["version"] + 1, "updated_at": now()}
    connection.execute(sa.update(lasers).where(lasers.c.id == laser_id).values(values))
    change = {"changed": {"review_due": {"from": row["review_due"], "to": due}}}
    record(connection, actor, Entry("laser changed", "laser", laser_id, change))


def _current(
    connection: sa.Connection, laser_id: int, number: int, version: int | None, states: tuple[str, ...]
) -> tuple[Any, Any]:
    """Rows of a laser and of its revision, if that is the current one in one of these states."""
    row = laser_row(connection, laser_id)
    expect_version(row, version)
    revision = revision_row(connection, laser_id, number)
    if row["status"] == "retired":
        raise Conflict(f"laser {row['asset_tag']!r} is retired; reinstate it first")
    if row["revision"] != number:
        raise Conflict(f"revision {number} is not the current one; that is revision {row['revision']}")
    if revision["state"] not in states:
        raise Conflict(f"revision {number} is {revision['state']}; expected {' or '.join(states)}")
    return row, revision


def _step(
    connection: sa.Connection,
    actor: Actor,
    row: Any,
    revision: Any,
    action: str,
    state: str,
    status: str,
    comment: str,
    more: dict[str, Any] | None = None,
) -> None:
    at = now()
    connection.execute(
        sa.insert(decisions).values(
            revision_id=revision["id"], action=action, by=actor.name, at=at, comment=comment
        )
    )
    connection.execute(sa.update(revisions).where(revisions.c.id == revision["id"]).values(state=state))
    values = {"status": status, "version": row["version"] + 1, "updated_at": at, **(more or {})}
    connection.execute(sa.update(lasers).where(lasers.c.id == row["id"]).values(values))
    detail = {
        "revision": revision["number"],
        "comment": comment,
        "request_digest": revision["request_digest"],
    }
    if more and "review_due" in more:
        detail["review_due"] = more["review_due"]
    record(connection, actor, Entry(f"revision {action}", "laser", row["id"], detail))


def _status(
    connection: sa.Connection,
    actor: Actor,
    row: Any,
    status: str,
    action: str,
    more: dict[str, Any] | None = None,
) -> None:
    values = {"status": status, "version": row["version"] + 1, "updated_at": now(), **(more or {})}
    connection.execute(sa.update(lasers).where(lasers.c.id == row["id"]).values(values))
    detail = {"status": {"from": row["status"], "to": status}}
    record(connection, actor, Entry(action, "laser", row["id"], detail))
