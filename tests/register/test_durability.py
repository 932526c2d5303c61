"""Power cuts, full disks, read-only files, and many writers at once."""

from __future__ import annotations

import asyncio
import os
import signal
import subprocess
import sys
from pathlib import Path

import psycopg
import pytest
import sqlalchemy as sa

from service.register.backup import check
from service.register.database import Database, database_url
from service.register.schema import lasers, revisions
from tests.register.postgresql import Server
from tests.register.web import LASERS, Web, laser
from tests.web.client import EVALUATE, GOOD
from tests.web.shape import assert_problem

ROOT = Path(__file__).resolve().parents[2]
WRITES, KILLED_AFTER = 1000, 150


def killed_while_writing(address: str) -> list[str]:
    """Lasers that a process told of before it was killed in the middle of its writes."""
    command = [sys.executable, "-m", "tests.register.writer", address, str(WRITES)]
    told = []
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True, cwd=ROOT) as process:
        assert process.stdout is not None
        for line in process.stdout:
            told.append(line.strip())
            if len(told) == KILLED_AFTER:
                os.kill(process.pid, signal.SIGKILL)
                break
        # What was told between the last line read and the kill counts too; the last line may be torn.
        rest = process.stdout.read().splitlines()
    assert process.returncode == -signal.SIGKILL
    assert len(told) + len(rest) < WRITES
    return told + [r for r in rest[:-1] if r]


def assert_whole(address: str, told: list[str]) -> None:
    database = Database(database_url(address, ""))
    database.open()
    with database.read() as connection:
        stored = connection.execute(sa.select(lasers.c.asset_tag, lasers.c.id)).all()
        held = set(connection.execute(sa.select(revisions.c.laser_id)).scalars())
    assert set(told) <= {tag for tag, _ in stored}
    assert held == {i for _, i in stored}
    # At most the one in flight was stored and not told.
    assert check(database) == []
    database.close()


def test_killed_in_the_middle_of_writes(address: str) -> None:
    assert_whole(address, killed_while_writing(address))


def test_the_database_server_killed_too(postgresql: Server) -> None:
    address = postgresql.emptied("made")
    told = killed_while_writing(address)
    postgresql.kill()
    postgresql.start()
    assert_whole(address, told)


def closed_for_writing(web: Web, address: str, request: pytest.FixtureRequest) -> Web:
    """The same register where the file, or the role of the database, can be read only."""
    web.app.state.register.engine.dispose()
    if web.app.state.register.sqlite:
        sa.event.listen(
            web.app.state.register.engine, "connect", lambda c, _: c.execute("PRAGMA query_only=ON")
        )
        return web
    server: Server = request.getfixturevalue("postgresql")
    server.sql("DO $$ BEGIN CREATE ROLE reader LOGIN; EXCEPTION WHEN duplicate_object THEN END $$")
    with psycopg.connect(address, autocommit=True) as connection:
        connection.execute("GRANT SELECT ON ALL TABLES IN SCHEMA public TO reader")
    return Web(address.replace(f"{server.user}@", "reader@"))


def test_a_register_that_cannot_be_written_says_so_and_can_be_read(
    web: Web, address: str, request: pytest.FixtureRequest
) -> None:
    found = web.create(laser())
    closed = closed_for_writing(web, address, request)
    moved = laser(place="x")
    for response in (closed.post(LASERS, laser("B")), closed.put(found, moved), closed.step(found, "submit")):
        document = assert_problem(response, 503)
        assert "readonly" in document["detail"] or "permission denied" in document["detail"]
        assert "Nothing was changed" in document["detail"]
        assert response.headers["retry-after"] == "5"
    assert closed.ok(closed.get(LASERS))["total"] == 1
    assert closed.ok(closed.get(f"{LASERS}/{found['id']}")) == found
    assert check(closed.app.state.register) == []
    if closed is not web:
        closed.close()


def test_a_full_disk_loses_nothing(tmp_path: Path) -> None:
    web = Web(f"sqlite:///{tmp_path}/register.sqlite3")
    web.create(laser("FIRST"))
    database: Database = web.app.state.register
    database.engine.dispose()
    sa.event.listen(database.engine, "connect", lambda c, _: c.execute("PRAGMA max_page_count=1"))
    responses = [web.post(LASERS, laser(f"L-{n}")) for n in range(20)]
    stored = [r for r in responses if r.status_code == 201]
    for response in responses:
        if response.status_code != 201:
            assert "full" in assert_problem(response, 503)["detail"]
    assert len(stored) < 20
    assert web.ok(web.get(LASERS))["total"] == 1 + len(stored)
    assert check(database) == []
    web.close()


def test_without_a_place_for_the_register_evaluations_go_on() -> None:
    web = Web("", data_dir="/proc/no/such/place")
    document = assert_problem(web.get(LASERS), 503)
    assert "/proc/no/such/place" in document["detail"]
    page = web.get("/lasers", headers={"accept": "text/html"})
    assert page.status_code == 503
    assert "/proc/no/such/place" in page.text
    web.ok(web.post(EVALUATE, GOOD))
    assert web.get("/").status_code == 200
    web.close()


def test_an_unreachable_server_is_told() -> None:
    web = Web("postgresql://nobody@127.0.0.1:1/none")
    assert "refused" in assert_problem(web.get(LASERS), 503)["detail"]
    web.close()


def test_two_editors_at_once_get_a_clear_conflict(web: Web) -> None:
    found = web.create(laser())
    headers = {"if-match": f'"laser-{found["id"]}-1"'}
    url = f"{LASERS}/{found['id']}"
    calls = [("PUT", url, {"json": laser(place=f"Room {n}"), "headers": headers}) for n in range(2)]
    responses = web.together(calls)
    assert sorted(r.status_code for r in responses) == [200, 412]
    (won,) = (r for r in responses if r.status_code == 200)
    assert web.ok(web.get(url))["place"] == won.json()["place"]


def test_sixteen_writers_lose_no_update(web: Web) -> None:
    """Each writer counts on from what it read; every count must arrive."""
    rounds = 2
    found = web.create(laser(place="0"))
    url = f"{LASERS}/{found['id']}"
    statuses: list[int] = []

    async def writer() -> None:
        for _ in range(rounds):
            while True:
                now = (await web.client.get(url)).json()
                body = laser(place=str(int(now["place"]) + 1))
                headers = {"if-match": f'"laser-{now["id"]}-{now["version"]}"'}
                response = await web.client.put(url, json=body, headers=headers)
                statuses.append(response.status_code)
                if response.status_code == 200:
                    break

    async def all_writers() -> None:
        await asyncio.gather(*(writer() for _ in range(16)))

    web.run(all_writers())
    assert set(statuses) <= {200, 412}
    final = web.ok(web.get(url))
    assert (final["place"], final["version"]) == (str(16 * rounds), 1 + 16 * rounds)
    assert check(web.app.state.register) == []


def test_sixteen_creators_at_once(web: Web) -> None:
    calls = [("POST", LASERS, {"json": laser(f"C-{n // 2}")}) for n in range(32)]
    statuses = sorted(r.status_code for r in web.together(calls))
    assert statuses == [201] * 16 + [409] * 16
    assert web.ok(web.get(LASERS))["total"] == 16
