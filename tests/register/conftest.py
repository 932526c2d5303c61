"""Every check of this folder that takes `database` or `web` runs on SQLite and on PostgreSQL."""

from __future__ import annotations

import os
import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest

from service.register import accounts
from service.register.database import Database, database_url
from tests.register.postgresql import Server, binaries, running
from tests.register.web import Web

REQUIRED = "TESTS_REQUIRE_EVERYTHING"


@pytest.fixture(scope="session")
def postgresql() -> Iterator[Server]:
    if binaries() is None:
        if os.environ.get(REQUIRED):
            pytest.fail("PostgreSQL is missing")
        pytest.skip("PostgreSQL is not installed")
    with running() as server:
        server.sql("CREATE DATABASE made")
        made = Database(database_url(server.address("made"), ""))
        made.open()
        made.close()
        yield server


@pytest.fixture(scope="session")
def sqlite_made(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A file whose tables are made."""
    file = tmp_path_factory.mktemp("made") / "register.sqlite3"
    made = Database(database_url(f"sqlite:///{file}", ""))
    made.open()
    made.close()
    return file


@pytest.fixture(autouse=True, scope="session")
def _cheap_passwords() -> Iterator[None]:
    """Passwords of these checks cost little; what is stored names its cost, so both kinds hold."""
    with pytest.MonkeyPatch.context() as patched:
        patched.setattr(accounts, "COST", 10)
        yield


@pytest.fixture(params=["sqlite", "postgresql"])
def address(request: pytest.FixtureRequest, tmp_path: Path) -> str:
    """Address of a register whose tables are made and empty."""
    if request.param == "postgresql":
        server: Server = request.getfixturevalue("postgresql")
        return server.emptied("made")
    shutil.copy(request.getfixturevalue("sqlite_made"), tmp_path / "register.sqlite3")
    return f"sqlite:///{tmp_path / 'register.sqlite3'}"


@pytest.fixture
def database(address: str) -> Iterator[Database]:
    opened = Database(database_url(address, ""))
    opened.open()
    yield opened
    opened.close()


@pytest.fixture
def web(address: str) -> Iterator[Web]:
    """The application without sign-in, as this machine sees it."""
    opened = Web(address)
    yield opened
    opened.close()
