"""Backup, restore and check of the register, the same for every database.

A backup is gzip-compressed JSON lines: one head, one line per row, one end with the counts. Sessions,
failed sign-ins and kept answers stay out. Restoring is possible into an empty register only.
"""

from __future__ import annotations

import base64
import gzip
import json
import os
from pathlib import Path
from typing import Any

import sqlalchemy as sa

from service import __version__
from service.register.audit import broken_links
from service.register.clock import now
from service.register.database import Database
from service.register.figures import digest_of, unpacked
from service.register.schema import TABLES_IN_ORDER, lasers, revisions

__all__ = ["BackupError", "backup", "check", "restore"]

FORMAT = 1
LEFT_OUT = ("sessions", "attempts", "replies", "matches")
BATCH = 500


class BackupError(ValueError):
    """A backup that cannot be written or read; the message says why."""


def _tables() -> list[sa.Table]:
    return [t for t in TABLES_IN_ORDER if t.name not in LEFT_OUT]


def _schema(connection: sa.Connection) -> str:
    return str(connection.execute(sa.text("SELECT version_num FROM alembic_version")).scalar_one())


def backup(database: Database, file: Path) -> dict[str, int]:
    """Write a backup of one state of the register, while it is in use; rows per table.

    The file appears whole or not at all, readable by its owner only. Raises BackupError, RegisterUnavailable.
    """
    counts: dict[str, int] = {}
    part = file.with_name(f"{file.name}.part")
    try:
        handle = os.open(part, os.O_WRONLY | os.O_CREAT | os.O_TRUNC, 0o600)
        with os.fdopen(handle, "wb") as raw, gzip.open(raw, "wt", encoding="utf-8") as out:
            with database.read() as connection:
                head = {
                    "format": FORMAT,
                    "schema": _schema(connection),
                    "made_at": now(),
                    "service": __version__,
                }
                out.write(json.dumps({"register": head}) + "\n")
                for table in _tables():
                    counts[table.name] = 0
                    rows = connection.execution_options(yield_per=BATCH).execute(sa.select(table))
                    for row in rows.mappings():
                        out.write(json.dumps([table.name, _out(row)], ensure_ascii=False) + "\n")
                        counts[table.name] += 1
            out.write(json.dumps({"end": counts}) + "\n")
        os.replace(part, file)
    except OSError as error:
        part.unlink(missing_ok=True)
        raise BackupError(f"cannot write {file}: {error.strerror or error}") from None
    return counts


def _out(row: Any) -> dict[str, Any]:
    return {
        k: {"base64": base64.b64encode(v).decode()} if isinstance(v, bytes) else v for k, v in row.items()
    }


def _in(row: dict[str, Any]) -> dict[str, Any]:
    return {k: base64.b64decode(v["base64"]) if isinstance(v, dict) else v for k, v in row.items()}


def restore(database: Database, file: Path) -> dict[str, int]:
    """Fill an empty register from a backup, wholly or not at all; rows per table.

    Raises BackupError where the file is damaged or from another version, or the register is not empty.
    """
    database.migrate()
    counts = {t.name: 0 for t in _tables()}
    tables = {t.name: t for t in _tables()}
    try:
        with gzip.open(file, "rt", encoding="utf-8") as lines, database.write() as connection:
            for table in _tables():
                if connection.execute(sa.select(sa.literal(1)).select_from(table).limit(1)).first():
                    raise BackupError(f"the register is not empty ({table.name}); restore into a new one")
            end, batch, of = None, list[dict[str, Any]](), ""
            head = json.loads(next(lines, "null"))
            if not isinstance(head, dict) or head.get("register", {}).get("format") != FORMAT:
                raise BackupError(f"{file} is no backup of a register")
            if head["register"]["schema"] != _schema(connection):
                raise BackupError(
                    f"{file} has tables of version {head['register']['schema']}, this service makes "
                    f"{_schema(connection)}; restore with the service that made it, then upgrade"
                )
            for line in lines:
                entry = json.loads(line)
                if isinstance(entry, dict):
                    end = entry.get("end")
                    break
                name, row = entry
                if batch and (name != of or len(batch) >= BATCH):
                    connection.execute(sa.insert(tables[of]), batch)
                    batch = []
                of = name
                batch.append(_in(row))
                counts[name] += 1
            if batch:
                connection.execute(sa.insert(tables[of]), batch)
            if end != counts:
                raise BackupError(f"{file} is not complete; nothing was restored")
            if not database.sqlite:
                _sequences(connection)
    except (OSError, EOFError, ValueError, KeyError, TypeError, sa.exc.IntegrityError) as error:
        if isinstance(error, BackupError):
            raise
        raise BackupError(f"cannot read {file}: {error}") from None
    return counts


def _sequences(connection: sa.Connection) -> None:
    """PostgreSQL numbers on from the highest id."""
    for table in _tables():
        if "id" in table.c:
            connection.execute(
                sa.text(
                    f"SELECT setval(pg_get_serial_sequence('{table.name}', 'id'), "
                    f"GREATEST((SELECT COALESCE(MAX(id), 0) FROM {table.name}), 1), "
                    f"(SELECT COUNT(*) > 0 FROM {table.name}))"
                )
            )


def check(database: Database) -> list[str]:
    """What is wrong with the register; empty where nothing is. Raises RegisterUnavailable."""
    found: list[str] = []
    with database.read() as connection:
        if database.sqlite:
            told = connection.execute(sa.text("PRAGMA integrity_check")).scalars().all()
            found += [f"database: {t}" for t in told if t != "ok"]
            found += [
                f"database: {tuple(r)}" for r in connection.execute(sa.text("PRAGMA foreign_key_check"))
            ]
        found += broken_links(connection)
        found += _revisions(connection)
    return found


def _revisions(connection: sa.Connection) -> list[str]:
    """Digests that do not hold, gaps in the numbers, lasers that point nowhere."""
    found: list[str] = []
    numbers: dict[int, list[int]] = {}
    states: dict[tuple[int, int], str] = {}
    query = sa.select(revisions).order_by(revisions.c.laser_id, revisions.c.number)
    for row in connection.execution_options(yield_per=BATCH).execute(query).mappings():
        name = f"revision {row['number']} of laser {row['laser_id']}"
        numbers.setdefault(row["laser_id"], []).append(row["number"])
        states[row["laser_id"], row["number"]] = row["state"]
        if digest_of(row["request"]) != row["request_digest"]:
            found.append(f"{name}: the request does not fit its digest")
        if (row["result"] is None) != (row["result_digest"] is None):
            found.append(f"{name}: result and digest do not go together")
        elif row["result"] is not None and digest_of(unpacked(row["result"])) != row["result_digest"]:
            found.append(f"{name}: the result does not fit its digest")
    for laser in connection.execute(sa.select(lasers)).mappings():
        name = f"laser {laser['id']} ({laser['asset_tag']})"
        if numbers.get(laser["id"], []) != list(range(1, laser["revision"] + 1)):
            found.append(f"{name}: its revisions are not 1 to {laser['revision']}")
        approved = laser["approved_revision"]
        if approved is not None and states.get((laser["id"], approved)) != "approved":
            found.append(f"{name}: revision {approved} is in force but not approved")
    return found
