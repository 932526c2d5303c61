"""A mixed load on one process: errors, times, memory, and how long the event loop lets others wait.

Run with ``python -m tests.bench.load [seconds]``. Pages and evaluations are also timed alone, in processor
time, over the starting examples.
"""

from __future__ import annotations

import asyncio
import html
import re
import sys
import time
import urllib.request
from itertools import cycle

from tests.bench.inventory import ndjson
from tests.bench.wire import Connection, Running, body_of, message, running
from tests.web.client import EVALUATE, GOOD

CONNECTIONS, SECONDS, TURNS = 16, 60.0, 40
PAUSE_S = 0.05


def examples(port: int) -> list[str]:
    """Addresses of the starting examples."""
    with urllib.request.urlopen(f"http://127.0.0.1:{port}/") as answer:
        text = answer.read().decode()
    return [html.unescape(link) for link in re.findall(r'href="(/evaluate\?[^"]+)"', text)]


async def times(port: int, wires: list[bytes], seconds: float, found: list[float]) -> None:
    """Time of each answer over one connection [s]."""
    connection = await Connection.open(port)
    end = time.perf_counter() + seconds
    for wire in cycle(wires):
        start = time.perf_counter()
        if start > end:
            return
        status, _ = await connection.ask(wire)
        assert status == 200
        found.append(time.perf_counter() - start)


async def waits(port: int, seconds: float, found: list[float]) -> None:
    """Time of a call that computes nothing, asked for again and again [s]."""
    connection = await Connection.open(port)
    wire = message("/health/live", b"", method="GET")
    end = time.perf_counter() + seconds
    while time.perf_counter() < end:
        start = time.perf_counter()
        await connection.ask(wire)
        found.append(time.perf_counter() - start)
        await asyncio.sleep(PAUSE_S)


def at(found: list[float], share: float) -> float:
    """A quantile in milliseconds."""
    return 1e3 * sorted(found)[min(len(found) - 1, int(share * len(found)))]


def alone(service: Running, name: str, wires: list[bytes]) -> None:
    """Processor time of each kind of request by itself."""
    before, found = service.cpu_s(), list[float]()

    async def all_of_them() -> None:
        connection = await Connection.open(service.port)
        for _ in range(TURNS):
            for wire in wires:
                start = time.perf_counter()
                await connection.ask(wire)
                found.append(time.perf_counter() - start)

    asyncio.run(all_of_them())
    cpu = (service.cpu_s() - before) / len(found)
    print(f"{name}: {1e3 * cpu:.1f} ms of processor, median {at(found, 0.5):.1f} ms, over {len(wires)} kinds")


def main() -> None:
    """Measure and print."""
    seconds = float(sys.argv[1]) if len(sys.argv) > 1 else SECONDS
    with running() as service:
        pages = [message(link, b"", method="GET") for link in examples(service.port)]
        single = [message(EVALUATE, body_of(GOOD))]
        bulk = [message("/api/v1/evaluate/bulk", ndjson(1000), "application/x-ndjson")]
        alone(service, "result page", pages)
        alone(service, "evaluation", single)
        before = service.resident_mb()
        kinds: dict[str, list[float]] = {"page": [], "evaluation": [], "bulk of 1000": [], "nothing": []}

        async def everything() -> None:
            clients = [
                times(service.port, pages, seconds, kinds["page"]) for _ in range(CONNECTIONS // 2 - 1)
            ]
            clients += [
                times(service.port, single, seconds, kinds["evaluation"]) for _ in range(CONNECTIONS // 2)
            ]
            clients.append(times(service.port, bulk, seconds, kinds["bulk of 1000"]))
            await asyncio.gather(*clients, waits(service.port, seconds, kinds["nothing"]))

        asyncio.run(everything())
        for name, found in kinds.items():
            print(
                f"{name}: {len(found)} answers, no error, median {at(found, 0.5):.0f} ms, "
                f"p99 {at(found, 0.99):.0f} ms, longest {at(found, 1.0):.0f} ms"
            )
        print(f"memory: {before:.0f} MB before, {service.resident_mb():.0f} MB after")


if __name__ == "__main__":
    main()
