"""A thousand slow and broken connections beside a normal client; a burst that is more than the service takes.

Run with ``python -m tests.bench.slow_clients``. It starts the service, and prints the times of the normal
client without and with the others, and how a burst is answered. Nothing is asserted.
"""

from __future__ import annotations

import asyncio
import contextlib
import os
import random
import resource
import socket
import subprocess
import sys
import time
from collections import Counter

import httpx

from tests.web.client import EVALUATE, GOOD

CONNECTIONS, REQUESTS, BURST, SECONDS = 1000, 200, 400, 5


def free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])


async def misbehave(port: int, kind: int, stop: asyncio.Event) -> str:
    """One connection: silent, trickling a head, stopping in a body, rubbish, leaving, or reading nothing."""
    try:
        line = socket.socket()
        line.setsockopt(socket.SOL_SOCKET, socket.SO_RCVBUF, 2048)
        line.setblocking(False)
        await asyncio.get_running_loop().sock_connect(line, ("127.0.0.1", port))
        reader, writer = await asyncio.open_connection(sock=line, limit=1024)
        head = b"POST /api/v1/evaluate HTTP/1.1\r\nhost: x\r\ncontent-type: application/json\r\n"
        if kind == 1:
            for byte in head:
                writer.write(bytes([byte]))
                await asyncio.sleep(0.3)
        elif kind == 2:
            writer.write(head + b"content-length: 500\r\n\r\n{")
        elif kind == 3:
            writer.write(random.Random(kind).randbytes(200) + b"\r\n\r\n")
        elif kind == 4:
            writer.write(head + b"content-length: 5\r\n\r\n")
            writer.transport.abort()
            return "left"
        elif kind == 5:
            writer.write(b"GET /rules/icnirp-2013 HTTP/1.1\r\nhost: x\r\n\r\n")
            await stop.wait()
            writer.transport.abort()
            return "held"
        await asyncio.wait_for(reader.read(), SECONDS * 6)
        writer.close()
        return "closed by the service"
    except TimeoutError:
        return "still open"
    except OSError:
        return "refused or reset"


async def normal(client: httpx.AsyncClient) -> list[float]:
    """Times of one client's requests, one after the other [s]."""
    times = []
    for _ in range(REQUESTS):
        begin = time.perf_counter()
        while (answer := await client.post(EVALUATE, json=GOOD)).status_code == 503:
            await asyncio.sleep(float(answer.headers["retry-after"]))
        answer.raise_for_status()
        times.append(time.perf_counter() - begin)
    return sorted(times)


def told(times: list[float]) -> str:
    middle, high = times[len(times) // 2], times[int(len(times) * 0.99)]
    return f"median {middle * 1e3:.1f} ms, p99 {high * 1e3:.1f} ms, worst {times[-1] * 1e3:.1f} ms"


async def measure(port: int) -> None:
    base = f"http://127.0.0.1:{port}"
    async with httpx.AsyncClient(base_url=base, timeout=60) as client:
        for _ in range(100):
            with contextlib.suppress(httpx.TransportError):
                await client.get("/health/ready")
                break
            await asyncio.sleep(0.2)
        await normal(client)
        alone = await normal(client)
        stop = asyncio.Event()
        others = [asyncio.create_task(misbehave(port, k % 6, stop)) for k in range(CONNECTIONS)]
        await asyncio.sleep(0.5)
        beside = await normal(client)
        stop.set()
        ends = Counter(await asyncio.gather(*others))
        print(f"alone:                       {told(alone)}")
        print(f"beside {CONNECTIONS} slow or broken:  {told(beside)}")
        print(
            f"p99 ratio {beside[int(REQUESTS * 0.99)] / alone[int(REQUESTS * 0.99)]:.2f}; ends: {dict(ends)}"
        )
    limits = httpx.Limits(max_connections=BURST, max_keepalive_connections=BURST)
    async with httpx.AsyncClient(base_url=base, timeout=120, limits=limits) as client:
        begin = time.perf_counter()
        answers = await asyncio.gather(*(client.post(EVALUATE, json=GOOD) for _ in range(BURST)))
        took = time.perf_counter() - begin
        statuses = Counter(a.status_code for a in answers)
        print(f"burst of {BURST}: {dict(statuses)} in {took:.2f} s")
        assert all("retry-after" in a.headers for a in answers if a.status_code == 503)
    async with httpx.AsyncClient(base_url=base, timeout=60) as client:
        after = await client.get("/health/live")
        print(f"after the burst: /health/live {after.status_code}; {told(await normal(client))}")


def main() -> None:
    soft, hard = resource.getrlimit(resource.RLIMIT_NOFILE)
    resource.setrlimit(resource.RLIMIT_NOFILE, (min(max(soft, 4096), hard), hard))
    port = free_port()
    environment = {**os.environ, "BLINKLINE_REQUEST_TIME": str(SECONDS), "BLINKLINE_RUNNING_LIMIT": "50"}
    command = [sys.executable, "-m", "service.cli", "serve", "--port", str(port)]
    with subprocess.Popen(command, env=environment, stderr=subprocess.DEVNULL) as service:
        try:
            asyncio.run(measure(port))
        finally:
            service.terminate()
            print(f"the service ended with {service.wait(30)}")


if __name__ == "__main__":
    main()
