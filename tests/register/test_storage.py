"""What the tables hold stays: migrations, triggers, the audit chain, backups."""

from __future__ import annotations

import gzip
import hashlib
import json
from pathlib import Path

import pytest
import sqlalchemy as sa
from alembic.autogenerate import compare_metadata
from alembic.migration import MigrationContext

from service.contract.request import EvaluationRequest
from service.register import audit, flow, lasers, shelf
from service.register.actor import Actor
from service.register.backup import BackupError, backup, check, restore
from service.register.database import Database, database_url
from service.register.figures import kept
from service.register.models import DecisionIn, EyewearIn, LaserIn
from service.register.problems import RegisterUnavailable
from service.register.schema import METADATA, TABLES_IN_ORDER, events, revisions
from tests.register.postgresql import Server
from tests.register.web import PAIR, laser

COVERED = ("previous", "at", "actor", "via", "action", "subject", "subject_id")
LSO = Actor("lso", "admin", "command")


def store(database: Database, tag: str = "BL-001") -> int:
    body = LaserIn.model_validate({**laser(tag)})
    with database.write() as connection:
        return lasers.create(connection, LSO, body, kept(body.asked))


def fill(database: Database) -> None:
    """Two lasers, one approved and changed since, and a pair."""
    first, _ = store(database, "BL-001"), store(database, "BL-002")
    with database.write() as connection:
        flow.submit(connection, LSO, first, 1, DecisionIn(), None)
        flow.approve(connection, LSO, first, 1, DecisionIn(comment="ok"), None)
        body = LaserIn.model_validate(laser("BL-001", power_w=0.5, place="Здание 4 · µ"))
        lasers.update(connection, LSO, first, None, body, kept(body.asked))
        shelf.add(connection, LSO, EyewearIn.model_validate(PAIR))


def content(database: Database) -> dict[str, list[tuple[object, ...]]]:
    with database.read() as connection:
        return {
            t.name: [tuple(r) for r in connection.execute(sa.select(t).order_by(*t.primary_key.columns))]
            for t in TABLES_IN_ORDER
        }


def test_migrations_make_the_tables_that_the_code_knows(database: Database) -> None:
    database.migrate()
    with database.read() as connection:
        assert compare_metadata(MigrationContext.configure(connection), METADATA) == []


def test_a_revision_cannot_be_changed_or_removed(database: Database) -> None:
    store(database)
    changes = [
        sa.update(revisions).values(request="{}"),
        sa.update(revisions).values(figures="{}"),
        sa.update(revisions).values(tables="{}"),
        sa.update(revisions).values(result=b"x"),
        sa.update(revisions).values(created_by="somebody"),
        sa.delete(revisions),
        sa.update(events).values(actor="somebody"),
        sa.delete(events),
    ]
    before = content(database)
    for change in changes:
        with pytest.raises((RegisterUnavailable, sa.exc.IntegrityError)), database.write() as connection:
            connection.execute(change)
    assert content(database) == before


def test_every_change_stands_in_the_chain(database: Database) -> None:
    fill(database)
    with database.read() as connection:
        found = list(audit.listed(connection))
        assert audit.broken_links(connection) == []
    actions = [e.action for e in reversed(found)]
    assert actions == [
        "laser created",
        "laser created",
        "revision submitted",
        "revision approved",
        "laser changed",
        "revision added",
        "eyewear added",
    ]
    assert found[2].detail["changed"]["place"] == {"from": "", "to": "Здание 4 · µ"}
    # The digest of the first entry, computed here by hand.
    first = found[-1]
    covered = [getattr(first, n) for n in COVERED]
    detail = json.dumps(first.detail, sort_keys=True, separators=(",", ":"), ensure_ascii=False)
    text = json.dumps([*covered, detail], separators=(",", ":"), ensure_ascii=False)
    assert first.previous == "0" * 64
    assert first.digest == hashlib.sha256(text.encode()).hexdigest()


def test_check_finds_what_was_tampered_with(database: Database) -> None:
    fill(database)
    assert check(database) == []
    with database.write() as connection:
        if database.sqlite:
            for name in ("events_stay", "revisions_stay"):
                connection.execute(sa.text(f"DROP TRIGGER {name}"))
        else:
            connection.execute(sa.text("SET session_replication_role = replica"))
        connection.execute(sa.update(events).where(events.c.id == 2).values(actor="somebody else"))
        second = sa.and_(revisions.c.laser_id == 1, revisions.c.number == 2)
        text = connection.execute(sa.select(revisions.c.request).where(second)).scalar_one()
        connection.execute(sa.update(revisions).where(second).values(request=text.replace("0.5", "0.4")))
    if not database.sqlite:
        with database.engine.begin() as connection:
            connection.execute(sa.text("SET session_replication_role = origin"))
    found = check(database)
    assert found == [
        "audit entry 2 was changed",
        "revision 2 of laser 1: the request does not fit its digest",
    ]


def test_a_backup_restores_into_either_database(
    database: Database, tmp_path: Path, postgresql: Server
) -> None:
    fill(database)
    file = tmp_path / "register.backup"
    counts = backup(database, file)
    assert counts["lasers"] == 2
    assert counts["revisions"] == 3
    assert file.stat().st_mode & 0o077 == 0
    kept_tables = [t.name for t in TABLES_IN_ORDER if t.name in counts]
    before = {n: rows for n, rows in content(database).items() if n in kept_tables}
    for address in (f"sqlite:///{tmp_path / 'other' / 'r.sqlite3'}", postgresql.new()):
        other = Database(database_url(address, ""))
        assert restore(other, file) == counts
        assert {n: rows for n, rows in content(other).items() if n in kept_tables} == before
        assert check(other) == []
        # It goes on where the old one stopped.
        assert store(other, "BL-003") == 3
        assert check(other) == []
        with pytest.raises(BackupError, match="not empty"):
            restore(other, file)
        other.close()


def test_a_damaged_backup_restores_nothing(database: Database, tmp_path: Path) -> None:
    fill(database)
    file = tmp_path / "whole"
    backup(database, file)
    lines = gzip.decompress(file.read_bytes()).splitlines(keepends=True)
    damaged = {
        "empty": b"",
        "text": b"hello",
        "cut file": file.read_bytes()[:-20],
        "cut lines": gzip.compress(b"".join(lines[:-3])),
        "line missing": gzip.compress(b"".join(lines[:3] + lines[4:])),
        "other version": gzip.compress(lines[0].replace(b"r0001", b"r9999") + b"".join(lines[1:])),
        "no backup": gzip.compress(b'{"a": 1}\n'),
    }
    for name, data in damaged.items():
        bad = tmp_path / "bad"
        bad.write_bytes(data)
        other = Database(database_url(f"sqlite:///{tmp_path / name}.sqlite3", ""))
        with pytest.raises(BackupError):
            restore(other, bad)
        assert content(other)["lasers"] == [], name
        other.close()


def test_a_backup_appears_whole_or_not_at_all(database: Database, tmp_path: Path) -> None:
    with pytest.raises(BackupError, match="cannot write"):
        backup(database, tmp_path / "no" / "such" / "folder")
    assert list(tmp_path.rglob("*.part")) == []


def test_a_stored_request_can_be_read_again(database: Database) -> None:
    store(database)
    with database.read() as connection:
        text = connection.execute(sa.select(revisions.c.request)).scalar_one()
    request = EvaluationRequest.model_validate(json.loads(text))
    assert request == LaserIn.model_validate(laser()).asked
