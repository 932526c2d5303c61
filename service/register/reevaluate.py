"""The whole register under the tables in use: what would change, before anything is adopted."""

from __future__ import annotations

import json
import logging
import threading
from typing import Any

import sqlalchemy as sa

from service import __version__
from service.contract.answer import rule_sets
from service.contract.problem import NotFound, Problem
from service.contract.result import Model
from service.register.actor import Actor
from service.register.audit import Entry, record, record_all
from service.register.clock import now, seconds_since
from service.register.database import Database
from service.register.difference import figures_changed
from service.register.figures import (
    CHUNK,
    Kept,
    canonical,
    digest_of,
    evaluated,
    request_from,
    tables_digest,
)
from service.register.lasers import new_revision
from service.register.models import Figures
from service.register.problems import Conflict
from service.register.schema import lasers, reevaluated, reevaluations, revisions
from service.register.stored import MOST

__all__ = ["Changed", "Run", "adopt", "changes_of", "run_of", "runs", "start", "work"]

LOG = logging.getLogger("blinkline")
#: A pass that has told nothing for so long was interrupted [s].
SILENT_S = 120.0
REASON = "re-evaluated under the tables in use"


class Run(Model):
    """One pass over the register."""

    id: int
    state: str
    by: str
    started_at: str
    ended_at: str | None
    total: int
    done: int
    changed: int
    adopted: int
    service_version: str
    tables_digest: str
    error: str


class Changed(Model):
    """A laser whose class, distance or density would change."""

    laser_id: int
    asset_tag: str
    label: str
    status: str
    revision: int
    old: Figures
    new: Figures
    adopted: bool


def all_tables() -> str:
    """One digest over the tables of every rule set."""
    return digest_of(canonical([tables_digest(key) for key in rule_sets()]))


def start(database: Database, actor: Actor, background: bool = True) -> int:
    """Begin a pass; its id. Raises Conflict while another one runs."""
    with database.write() as connection:
        running = sa.select(reevaluations).where(reevaluations.c.state == "running")
        for other in connection.execute(running).mappings().all():
            if seconds_since(other["beat_at"]) < SILENT_S:
                raise Conflict(f"re-evaluation {other['id']} is still running")
            _set(connection, other["id"], state="failed", ended_at=now(), error="interrupted")
        total = connection.execute(
            sa.select(sa.func.count()).select_from(lasers).where(lasers.c.status != "retired")
        ).scalar_one()
        values = {
            "started_at": now(),
            "beat_at": now(),
            "by": actor.name,
            "state": "running",
            "total": total,
            "done": 0,
            "tables_digest": all_tables(),
            "service_version": __version__,
            "error": "",
        }
        insert = sa.insert(reevaluations).values(values).returning(reevaluations.c.id)
        run_id = int(connection.execute(insert).scalar_one())
        record(connection, actor, Entry("re-evaluation started", "reevaluation", run_id, {"lasers": total}))
    if background:
        threading.Thread(target=work, args=(database, run_id), daemon=True).start()
    return run_id


def work(database: Database, run_id: int) -> None:
    """Evaluate every laser in use, batch by batch; progress stands in the register."""
    try:
        last, done = 0, 0
        while True:
            with database.read() as connection:
                rows = _chunk(connection, last)
            if not rows:
                break
            last, done = rows[-1]["id"], done + len(rows)
            found = evaluated([request_from(r["request"]) for r in rows])
            differs = [_differs(r["figures"], k) for r, k in zip(rows, found, strict=True)]
            changed = [_row(run_id, r, k) for r, k, d in zip(rows, found, differs, strict=True) if d]
            with database.write() as connection:
                if changed:
                    connection.execute(sa.insert(reevaluated), changed)
                _confirm(connection, [r for r, d in zip(rows, differs, strict=True) if not d])
                _set(connection, run_id, done=done, beat_at=now())
        with database.write() as connection:
            _set(connection, run_id, state="done", ended_at=now())
    except Exception as error:
        LOG.exception("re-evaluation %s failed", run_id)
        reason = error.detail if isinstance(error, Problem) else type(error).__name__
        with database.write() as connection:
            _set(connection, run_id, state="failed", ended_at=now(), error=reason[:500])


def _chunk(connection: sa.Connection, last: int) -> list[Any]:
    current = sa.and_(revisions.c.laser_id == lasers.c.id, revisions.c.number == lasers.c.revision)
    query = (
        sa.select(lasers.c.id, lasers.c.revision, lasers.c.rules_id, revisions.c.request, revisions.c.figures)
        .join(revisions, current)
        .where(lasers.c.id > last, lasers.c.status != "retired")
        .order_by(lasers.c.id)
        .limit(CHUNK)
    )
    return [dict(r) for r in connection.execute(query).mappings()]


def _confirm(connection: sa.Connection, rows: list[Any]) -> None:
    """Lasers whose figures hold under the tables in use."""
    for rules_id in {r["rules_id"] for r in rows}:
        same = [
            lasers.c.id.in_([r["id"] for r in rows if r["rules_id"] == rules_id]),
            lasers.c.rules_id == rules_id,
            lasers.c.tables_digest != tables_digest(rules_id),
        ]
        connection.execute(sa.update(lasers).where(*same).values(tables_digest=tables_digest(rules_id)))


def _differs(old: str, kept: Kept) -> bool:
    return figures_changed(Figures.model_validate_json(old), kept.figures)


def _row(run_id: int, row: Any, kept: Kept) -> dict[str, Any]:
    return {
        "run_id": run_id,
        "laser_id": row["id"],
        "revision": row["revision"],
        "old": row["figures"],
        "new": canonical(json.loads(kept.figures.model_dump_json())),
        "adopted": False,
    }


def _set(connection: sa.Connection, run_id: int, **values: Any) -> None:
    connection.execute(sa.update(reevaluations).where(reevaluations.c.id == run_id).values(**values))


def runs(connection: sa.Connection, limit: int = 20) -> list[Run]:
    """The latest passes, the newest first."""
    query = sa.select(reevaluations).order_by(reevaluations.c.id.desc()).limit(limit)
    return [_run(connection, dict(r)) for r in connection.execute(query).mappings()]


def run_of(connection: sa.Connection, run_id: int) -> Run:
    """One pass. Raises NotFound."""
    if run_id > MOST:
        raise NotFound(f"there is no re-evaluation {run_id}")
    row = connection.execute(sa.select(reevaluations).where(reevaluations.c.id == run_id)).mappings().first()
    if row is None:
        raise NotFound(f"there is no re-evaluation {run_id}")
    return _run(connection, dict(row))


def _run(connection: sa.Connection, row: dict[str, Any]) -> Run:
    query = sa.select(sa.func.count()).select_from(reevaluated).where(reevaluated.c.run_id == row["id"])
    changed = connection.execute(query).scalar_one()
    adopted = connection.execute(query.where(reevaluated.c.adopted.is_(True))).scalar_one()
    del row["beat_at"]
    return Run(**row, changed=changed, adopted=adopted)


def changes_of(connection: sa.Connection, run_id: int) -> list[Changed]:
    """Lasers that a pass would change, old beside new. Raises NotFound."""
    run_of(connection, run_id)
    query = (
        sa.select(reevaluated, lasers.c.asset_tag, lasers.c.label, lasers.c.status)
        .join(lasers, lasers.c.id == reevaluated.c.laser_id)
        .where(reevaluated.c.run_id == run_id)
        .order_by(lasers.c.asset_tag)
    )
    return [
        Changed(
            laser_id=r["laser_id"],
            asset_tag=r["asset_tag"],
            label=r["label"],
            status=r["status"],
            revision=r["revision"],
            old=Figures.model_validate_json(r["old"]),
            new=Figures.model_validate_json(r["new"]),
            adopted=r["adopted"],
        )
        for r in connection.execute(query).mappings()
    ]


def adopt(
    connection: sa.Connection, actor: Actor, run_id: int, laser_ids: list[int] | None
) -> tuple[list[int], list[str]]:
    """Make a new draft revision of the lasers named (None: all that changed); ids, and what was left out.

    A laser that changed since the pass, or awaits a decision, is left out and named. Raises NotFound,
    and Conflict where the pass is not done or the tables have changed since.
    """
    run = run_of(connection, run_id)
    if run.state != "done":
        raise Conflict(f"re-evaluation {run_id} is {run.state}")
    if run.tables_digest != all_tables() or run.service_version != __version__:
        raise Conflict(f"the tables have changed since re-evaluation {run_id}; run it again")
    done: list[int] = []
    left: list[str] = []
    entries: list[Entry] = []
    for change in changes_of(connection, run_id):
        if change.adopted or (laser_ids is not None and change.laser_id not in laser_ids):
            continue
        row = connection.execute(sa.select(lasers).where(lasers.c.id == change.laser_id)).mappings().one()
        if row["revision"] != change.revision or row["status"] in ("submitted", "retired"):
            left.append(f"{change.asset_tag}: changed, retired or awaiting a decision since")
            continue
        number = sa.and_(revisions.c.laser_id == change.laser_id, revisions.c.number == change.revision)
        text = connection.execute(sa.select(revisions.c.request).where(number)).scalar_one()
        kept = Kept(request_from(text), change.new, None)
        values = new_revision(connection, actor, row, kept, REASON, entries)
        values |= {"version": row["version"] + 1, "updated_at": now()}
        connection.execute(sa.update(lasers).where(lasers.c.id == change.laser_id).values(values))
        same = [reevaluated.c.run_id == run_id, reevaluated.c.laser_id == change.laser_id]
        connection.execute(sa.update(reevaluated).where(*same).values(adopted=True))
        done.append(change.laser_id)
    record_all(
        connection,
        actor,
        [*entries, Entry("re-evaluation adopted", "reevaluation", run_id, {"lasers": done})],
    )
    return done, left
