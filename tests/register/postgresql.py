"""A PostgreSQL server of our own in a temporary folder: a socket, no TCP, gone afterwards."""

from __future__ import annotations

import os
import pwd
import shutil
import subprocess
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import psycopg

from service.register.schema import TABLES_IN_ORDER

__all__ = ["Server", "binaries", "running"]

BINARIES = sorted(Path("/usr/lib/postgresql").glob("*/bin"), key=lambda p: int(p.parent.name))


def binaries() -> Path | None:
    """Folder of initdb and postgres; None where there is no PostgreSQL."""
    if BINARIES:
        return BINARIES[-1]
    found = shutil.which("initdb")
    return Path(found).parent if found else None


class Server:
    """A running server."""

    def __init__(self, folder: Path, program: Path, user: str) -> None:
        self.folder, self.program, self.user, self.count = folder, program, user, 0

    def address(self, name: str) -> str:
        return f"postgresql://{self.user}@/{name}?host={self.folder}"

    def sql(self, statement: str) -> None:
        with psycopg.connect(self.address("postgres"), autocommit=True) as connection:
            connection.execute(statement)

    def new(self, template: str = "template0") -> str:
        """Address of a new database."""
        self.count += 1
        self.sql(f"CREATE DATABASE t{self.count} TEMPLATE {template}")
        return self.address(f"t{self.count}")

    def emptied(self, name: str) -> str:
        """Address of a database whose tables hold nothing; only a superuser can do so past the triggers."""
        tables = ", ".join(t.name for t in TABLES_IN_ORDER)
        with psycopg.connect(self.address(name), autocommit=True) as connection:
            connection.execute("SET session_replication_role = replica")
            connection.execute(f"TRUNCATE {tables} RESTART IDENTITY")  # type: ignore[arg-type]
        return self.address(name)

    def run(self, *command: str) -> None:
        """A program of the server, as its user."""
        demote = {"user": self.user} if os.getuid() == 0 else {}
        subprocess.run(
            [self.program / command[0], *command[1:]],
            check=True,
            capture_output=True,
            cwd=self.folder,
            env={"PATH": os.environ["PATH"], "LC_ALL": "C"},
            **demote,  # type: ignore[call-overload]
        )

    def kill(self) -> None:
        """Stop as if the power failed: no checkpoint, no farewell."""
        self.run("pg_ctl", "-D", "data", "-m", "immediate", "-w", "stop")

    def start(self) -> None:
        options = f"-k {self.folder} -c listen_addresses='' -c max_connections=100 -c fsync=off"
        self.run("pg_ctl", "-D", "data", "-w", "-l", "log", "-o", options, "start")


@contextmanager
def running() -> Iterator[Server]:
    """A server with an empty cluster."""
    program = binaries()
    assert program is not None
    user = "postgres" if os.getuid() == 0 else pwd.getpwuid(os.getuid()).pw_name
    folder = Path(tempfile.mkdtemp(prefix="pg-"))
    if os.getuid() == 0:
        shutil.chown(folder, user)
    server = Server(folder, program, user)
    try:
        server.run("initdb", "-D", "data", "-U", user, "-A", "trust", "-E", "UTF8", "--no-locale")
        server.start()
        yield server
        server.run("pg_ctl", "-D", "data", "-m", "immediate", "-w", "stop")
    finally:
        shutil.rmtree(folder, ignore_errors=True)
