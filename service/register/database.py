"""The database of the register: SQLite file or PostgreSQL, one way to read, one way to write.

Writers come one after the other (SQLite: BEGIN IMMEDIATE; PostgreSQL: an advisory lock), so the audit
log is one chain and no update is lost. A change is on disk before it is acknowledged.
"""

from __future__ import annotations

import os
import sqlite3
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from importlib.util import find_spec
from pathlib import Path
from typing import Any

import sqlalchemy as sa
from alembic.config import Config
from alembic.runtime.environment import EnvironmentContext
from alembic.script import ScriptDirectory

from service.register.problems import RegisterUnavailable

__all__ = ["Database", "database_url", "shown_url"]

MIGRATIONS = Path(__file__).resolve().parent / "migrations"
#: Writers of this service hold this advisory lock of PostgreSQL.
WRITERS = 5_320_106_401
READ_ONLY = "register_read_only"
BUSY_MS = 10_000


def database_url(database: str, data_dir: str) -> sa.URL:
    """Where the register is kept: the database named, or a file in the data folder.

    Raises ValueError for a database that is neither PostgreSQL nor SQLite.
    """
    if not database:
        folder = Path(data_dir) if data_dir else _default_folder()
        return sa.URL.create("sqlite", database=str(folder.expanduser().absolute() / "register.sqlite3"))
    try:
        url = sa.make_url(database)
    except sa.exc.ArgumentError:
        raise ValueError("it is no address such as postgresql://user@host/name") from None
    if url.drivername in ("postgresql", "postgres", "postgresql+psycopg"):
        if find_spec("psycopg") is None:
            raise ValueError("PostgreSQL needs the extra 'postgresql' (the package psycopg)")
        return url.set(drivername="postgresql+psycopg")
    if url.drivername == "sqlite" and url.database and url.database != ":memory:":
        return url
    raise ValueError(f"{url.drivername!r} is not supported; use postgresql:// or sqlite:///file")


def shown_url(url: sa.URL) -> str:
    """The address for messages, without the password."""
    return url.render_as_string(hide_password=True) if url.drivername != "sqlite" else str(url.database)


def _default_folder() -> Path:
    base = os.environ.get("XDG_DATA_HOME")
    return (Path(base) if base else Path("~/.local/share")) / "blinkline"


class Database:
    """A pool of connections; `read` and `write` are transactions.

    Raises RegisterUnavailable, with the reason, where the database cannot be reached or written.
    """

    def __init__(self, url: sa.URL) -> None:
        self.url = url
        self.sqlite = url.drivername == "sqlite"
        self._writing, self._opening = threading.Lock(), threading.Lock()
        self._opened = False
        if self.sqlite:
            options: dict[str, Any] = {
                "connect_args": {"timeout": BUSY_MS / 1000, "check_same_thread": False}
            }
        else:
            options = {"pool_pre_ping": True, "connect_args": {"connect_timeout": 5}}
        self.engine = sa.create_engine(url, pool_size=10, max_overflow=40, pool_timeout=20, **options)
        if self.sqlite:
            sa.event.listen(self.engine, "connect", _on_connect)
            sa.event.listen(self.engine, "begin", _on_begin)

    @contextmanager
    def read(self) -> Iterator[sa.Connection]:
        """A transaction that sees one state of the register and changes nothing."""
        with self._told(), self.engine.connect() as connection:
            options: dict[str, Any] = {READ_ONLY: True}
            if not self.sqlite:
                options |= {"isolation_level": "REPEATABLE READ", "postgresql_readonly": True}
            with connection.execution_options(**options).begin():
                yield connection

    @contextmanager
    def write(self) -> Iterator[sa.Connection]:
        """A transaction that is wholly done when the block ends, or not at all."""
        with self._told():
            if not self._writing.acquire(timeout=30):
                raise RegisterUnavailable("another change takes too long; try again", {"retry-after": "5"})
            try:
                with self.engine.begin() as connection:
                    if not self.sqlite:
                        connection.execute(sa.text("SELECT pg_advisory_xact_lock(:n)"), {"n": WRITERS})
                    yield connection
            finally:
                self._writing.release()

    def open(self) -> None:
        """Bring the tables up to date, once in the life of this object."""
        if not self._opened:
            with self._opening:
                if not self._opened:
                    self.migrate()
                    self._opened = True

    def migrate(self) -> None:
        """Bring the tables up to date; makes the folder and the file where there is none yet."""
        if self.sqlite:
            file = Path(str(self.url.database))
            try:
                file.parent.mkdir(parents=True, exist_ok=True, mode=0o700)
            except OSError as error:
                raise RegisterUnavailable(f"cannot make the folder {file.parent}: {error.strerror}") from None
        with self.write() as connection:
            config = Config()
            config.set_main_option("script_location", str(MIGRATIONS))
            script = ScriptDirectory.from_config(config)

            def upgrade(revision: Any, _: Any) -> Any:
                return script._upgrade_revs("head", revision)

            with EnvironmentContext(config, script, fn=upgrade) as environment:
                environment.configure(connection=connection)
                environment.run_migrations()

    def close(self) -> None:
        """Give every connection back."""
        self.engine.dispose()

    @contextmanager
    def _told(self) -> Iterator[None]:
        """Failures of the database as a problem that says why."""
        try:
            yield
        except sa.exc.IntegrityError:
            raise
        except (sa.exc.DBAPIError, sqlite3.Error) as error:
            reason = str(getattr(error, "orig", error)).strip() or "no reason given"
            raise RegisterUnavailable(
                f"the register cannot be used: {reason.splitlines()[0]}. Nothing was changed.",
                {"retry-after": "5"},
            ) from error
        except sa.exc.TimeoutError as error:
            raise RegisterUnavailable("too many requests at once; try again", {"retry-after": "5"}) from error


def _on_connect(connection: sqlite3.Connection, _: object) -> None:
    """Transactions are begun by us; every commit is on disk before it is acknowledged."""
    connection.isolation_level = None
    for pragma in (
        f"busy_timeout={BUSY_MS}",
        "journal_mode=WAL",
        "synchronous=FULL",
        "foreign_keys=ON",
    ):
        connection.execute(f"PRAGMA {pragma}")


def _on_begin(connection: sa.Connection) -> None:
    reading = connection.get_execution_options().get(READ_ONLY)
    connection.exec_driver_sql("BEGIN" if reading else "BEGIN IMMEDIATE")
