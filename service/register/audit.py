"""The audit log: every change, in one chain, never altered.

The digest of an entry covers its content and the digest of the entry before it, so a changed or
missing entry shows. That the last entries are missing shows only beside an export made before.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, field
from typing import Any

import sqlalchemy as sa

from service.register.actor import Actor
from service.register.clock import now
from service.register.figures import canonical
from service.register.models import Event
from service.register.schema import events

__all__ = ["Entry", "broken_links", "listed", "record", "record_all"]

START = "0" * 64


@dataclass(frozen=True, slots=True)
class Entry:
    """What happened to what; `detail` says from what to what."""

    action: str
    subject: str
    subject_id: int
    detail: dict[str, Any] = field(default_factory=dict)


def record(connection: sa.Connection, actor: Actor, entry: Entry) -> None:
    """Add one entry, in the transaction of the change it tells of."""
    record_all(connection, actor, [entry])


def record_all(connection: sa.Connection, actor: Actor, entries: Iterable[Entry]) -> None:
    """Add entries in order."""
    last = connection.execute(sa.select(events.c.digest).order_by(events.c.id.desc()).limit(1)).scalar()
    previous, at, rows = last or START, now(), []
    for entry in entries:
        row = {
            "at": at,
            "actor": actor.name,
            "via": actor.via,
            "action": entry.action,
            "subject": entry.subject,
            "subject_id": entry.subject_id,
            "detail": canonical(entry.detail),
            "previous": previous,
        }
        row["digest"] = previous = _digest(row)
        rows.append(row)
    if rows:
        connection.execute(sa.insert(events), rows)


def _digest(row: dict[str, Any]) -> str:
    text = canonical(
        [row[k] for k in ("previous", "at", "actor", "via", "action", "subject", "subject_id", "detail")]
    )
    return hashlib.sha256(text.encode()).hexdigest()


def listed(
    connection: sa.Connection,
    *,
    before: int | None = None,
    subject: str | None = None,
    subject_id: int | None = None,
    limit: int | None = None,
) -> Iterator[Event]:
    """Entries, the newest first; `before` is the id from which on to go back."""
    query = sa.select(events).order_by(events.c.id.desc())
    if before is not None:
        query = query.where(events.c.id < before)
    if subject is not None:
        query = query.where(events.c.subject == subject)
    if subject_id is not None:
        query = query.where(events.c.subject_id == subject_id)
    for row in connection.execute(query.limit(limit) if limit else query).mappings():
        yield Event.model_validate({**row, "detail": json.loads(row["detail"])})


def broken_links(connection: sa.Connection) -> list[str]:
    """Entries whose digest or whose link to the entry before does not hold."""
    found, previous = [], START
    for row in connection.execute(sa.select(events).order_by(events.c.id)).mappings():
        if row["previous"] != previous:
            found.append(f"audit entry {row['id']} does not follow the entry before it")
        if row["digest"] != _digest(dict(row)):
            found.append(f"audit entry {row['id']} was changed")
        previous = row["digest"]
    return found
