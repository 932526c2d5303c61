"""What the register costs, in one run, with ratios: ``python -m tests.bench.register``."""

from __future__ import annotations

import tempfile
import time
from pathlib import Path

from service.register import lasers, reevaluate
from service.register.actor import Actor
from service.register.backup import check
from service.register.database import Database, database_url
from service.register.figures import evaluated, kept
from service.register.importing import import_all
from service.register.listing import Filters, page_of
from service.register.models import LaserIn
from service.web.register.csv_columns import exported
from service.web.register.csv_read import read_csv
from tests.register.test_csv import HEAD

ROWS = 10_000
ACTOR = Actor("bench", "admin", "command")


def main() -> None:
    rows = [f"T-{n},Laser {n},,{400 + n % 700},cw,{(1 + n % 50) * 0.001:.3f},2,1" for n in range(ROWS)]
    data = "\r\n".join((HEAD, *rows)).encode()
    with tempfile.TemporaryDirectory() as folder:
        database = Database(database_url(f"sqlite:///{Path(folder) / 'register.sqlite3'}", ""))
        database.open()
        clock = time.process_time, time.perf_counter

        def timed(name: str, work: object) -> tuple[object, float]:
            cpu, wall = (c() for c in clock)
            found = work()  # type: ignore[operator]
            cpu, wall = clock[0]() - cpu, clock[1]() - wall
            print(f"{name:<42} {cpu:8.3f} s of processor {wall:8.3f} s on the clock")
            return found, cpu

        bodies, _ = timed(f"read {ROWS} rows of CSV", lambda: read_csv(data))
        assert isinstance(bodies, list)
        asked = [body.asked for _, body in bodies]
        _, batch = timed(f"evaluate {ROWS} lasers as batches", lambda: evaluated(asked))
        _, single = timed("evaluate 200 lasers one by one", lambda: [kept(a) for a in asked[:200]])
        timed(f"import {ROWS} rows", lambda: import_all(database, ACTOR, read_csv(data)))
        timed("import the same again, nothing changes", lambda: import_all(database, ACTOR, read_csv(data)))
        timed("export", lambda: "".join(exported(database, Filters())))

        def run() -> None:
            reevaluate.work(database, reevaluate.start(database, ACTOR, background=False))

        timed("re-evaluate the register", run)

        def one(n: int) -> None:
            body = LaserIn.model_validate({"asset_tag": f"ONE-{n}", "request": asked[0]})
            found = kept(body.asked)
            with database.write() as connection:
                lasers.create(connection, ACTOR, body, found)

        timed("store 100 lasers one by one, each on disk", lambda: [one(n) for n in range(100)])

        def page() -> None:
            with database.read() as connection:
                page_of(connection, Filters(q="laser 99", sort="distance"), 50, None)

        timed("search, 20 times", lambda: [page() for _ in range(20)])
        timed("check digests and the audit chain", lambda: check(database))
        print(f"one by one / batch, per laser: {single / 200 / (batch / ROWS):.0f}")
        database.close()


if __name__ == "__main__":
    main()
