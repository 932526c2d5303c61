"""Many lasers: the bulk call against its bare twin, one pass against one request each, and a million lines.

Run with ``python -m tests.bench.bulk``; with ``--million`` it also sends a million lasers through the command
and through a series of calls, and prints the memory they take.
"""

from __future__ import annotations

import asyncio
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from service.bulk.records import Records, body_lines
from service.columns import evaluate_columns
from service.contract.answer import answer
from service.contract.reading import read_json, request_of
from service.garbage import settle
from tests.bench.inventory import lasers, ndjson
from tests.bench.wire import BARE_BULK, Connection, Running, message, running

BULK = "/api/v1/evaluate/bulk"
COUNT, ROUNDS, MILLION, SERIES = 20_000, 3, 1_000_000, 50_000
NDJSON = "application/x-ndjson"


async def send(port: int, wire: bytes) -> float:
    """Seconds for one call."""
    connection = await Connection.open(port)
    start = time.perf_counter()
    status, _ = await connection.ask(wire)
    assert status == 200
    return time.perf_counter() - start


def over_http(service: Running) -> None:
    """The bulk call and its bare twin in turns: medians of processor time."""
    body = ndjson(COUNT)
    found: dict[str, list[float]] = {BARE_BULK: [], BULK: []}
    for path in [BARE_BULK, BULK] * ROUNDS:
        before = service.cpu_s()
        seconds = asyncio.run(send(service.port, message(path, body, NDJSON)))
        cpu = service.cpu_s() - before
        found[path].append(cpu)
        print(f"{path}: {COUNT / seconds:,.0f} lasers/s, {COUNT / cpu:,.0f} per second of processor")
    bare, whole = (sorted(found[path])[ROUNDS // 2] for path in (BARE_BULK, BULK))
    print(f"cost of the bulk call / of reading and writing alone = {whole / bare:.2f}")


def in_process() -> None:
    """One pass against one request each, and columns, in this process."""
    settle()
    body = ndjson(COUNT)
    start = time.process_time()
    for _ in Records(body_lines(body), "summary").lines():
        pass
    together = (time.process_time() - start) / COUNT
    few = list(body_lines(ndjson(200)))
    start = time.process_time()
    for line in few:
        answer(request_of(read_json(line))).model_dump_json()
    alone = (time.process_time() - start) / len(few)
    table = columns(COUNT)
    start = time.process_time()
    found = evaluate_columns(table)
    assert not any(found["problem"])
    as_columns = (time.process_time() - start) / COUNT
    print(
        f"summary in one pass {1e6 * together:.1f} us, whole answer {1e6 * alone:.0f} us of processor a laser"
    )
    print(f"ratio whole answer / summary = {alone / together:.0f}")
    print(f"evaluate_columns: {1 / as_columns:,.0f} lasers per second of processor, classes included")


def columns(count: int) -> dict[str, list[object]]:
    """The inventory as columns."""
    rows = []
    for laser in lasers(count):
        (line,) = laser["lines"]
        row = {"wavelength_nm": float(line["wavelength_nm"]), **line["emission"], **line["beam"]}
        if isinstance(row["diameter_mm"], list):
            row["diameter_mm"], row["diameter_y_mm"] = row["diameter_mm"]
        rows.append(row)
    names = dict.fromkeys(name for row in rows for name in row)
    return {name: [row.get(name) for row in rows] for name in names}


def million(service: Running) -> None:
    """A million lasers through the command, then through calls of 50,000."""
    with tempfile.TemporaryDirectory() as folder:
        source, out = Path(folder, "in.ndjson"), Path(folder, "out.ndjson")
        with source.open("wb") as stream:
            for part in range(MILLION // SERIES):
                stream.write(ndjson(SERIES, seed=part))
        start = time.perf_counter()
        command = [sys.executable, "-m", "service.cli", "evaluate", str(source), "-o", str(out)]
        with subprocess.Popen(command, text=True) as process:
            watched = Running(0, process)
            cpu = resident = 0.0
            while process.poll() is None:
                cpu, resident = watched.cpu_s(), max(resident, watched.resident_mb())
                time.sleep(0.2)
        seconds = time.perf_counter() - start
        print(
            f"command: {MILLION / seconds:,.0f} lasers/s, {MILLION / cpu:,.0f} per second of processor, "
            f"{resident:.0f} MB resident at most"
        )
    for part in range(MILLION // SERIES):
        asyncio.run(send(service.port, message(BULK, ndjson(SERIES, seed=part), NDJSON)))
    print(f"calls of {SERIES:,}: at most {service.resident_mb('VmHWM'):.0f} MB resident")


def main() -> None:
    """Measure and print."""
    with running() as service:
        over_http(service)
    in_process()
    if "--million" in sys.argv:
        with running() as service:
            million(service)


if __name__ == "__main__":
    main()
