"""A service in a process of its own with bare twins of its calls, and a small client that costs little.

A bare twin reads the same request with the same models and sends an answer of the same models that was made
beforehand: what it costs is everything but the computation.
"""

from __future__ import annotations

import asyncio
import json
import os
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Annotated, Any

import uvicorn
from fastapi import Depends, FastAPI
from starlette.requests import Request
from starlette.responses import Response, StreamingResponse

from service.app import create_app
from service.bulk.records import body_lines
from service.bulk.summary import Summary, summaries
from service.contract.answer import answer
from service.contract.evaluation import EvaluationResult
from service.contract.reading import read_json, request_of
from service.contract.request import EvaluationRequest
from service.garbage import settle
from service.settings import Settings
from service.web.body import read_request
from service.web.encoding import read_large_body
from tests.web.client import GOOD

BARE, BARE_BULK = "/bare", "/bare/bulk"
EXAMPLE = EvaluationRequest.model_validate(GOOD)


def application() -> FastAPI:
    """The service with the bare twins."""
    app = create_app(Settings(bulk_body_limit=1_000_000_000))
    whole = answer(EXAMPLE).model_dump()
    (short,) = summaries([EXAMPLE], [0])

    @app.post(BARE)
    async def bare(body: Annotated[EvaluationRequest, Depends(read_request)]) -> Response:
        made = EvaluationResult.model_validate(whole)
        return Response(made.model_dump_json(), media_type="application/json")

    @app.post(BARE_BULK)
    async def bare_bulk(request: Request) -> StreamingResponse:
        body = await read_large_body(request, 1_000_000_000)

        def pieces() -> Iterator[bytes]:
            made: list[bytes] = []
            for line in body_lines(body):
                request_of(read_json(line))
                made.append(Summary.model_validate(short).model_dump_json().encode())
                if len(made) == 1000:
                    yield b"\n".join(made) + b"\n"
                    made = []
            yield b"\n".join(made)

        return StreamingResponse(pieces(), media_type="application/x-ndjson")

    settle()
    return app


@dataclass
class Running:
    """A service that runs: its port and its process."""

    port: int
    process: subprocess.Popen[str]

    def cpu_s(self) -> float:
        """Processor time used so far [s]."""
        with open(f"/proc/{self.process.pid}/stat") as stat:
            fields = stat.read().rpartition(")")[2].split()
        return (int(fields[11]) + int(fields[12])) / os.sysconf("SC_CLK_TCK")

    def resident_mb(self, name: str = "VmRSS") -> float:
        """Resident memory now, or at most so far (VmHWM) [MB]."""
        with open(f"/proc/{self.process.pid}/status") as status:
            return next((int(line.split()[1]) / 1024 for line in status if line.startswith(name)), 0.0)


@contextmanager
def running() -> Iterator[Running]:
    """A service on a free port."""
    command = [sys.executable, "-m", "tests.bench.wire"]
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as process:
        assert process.stdout is not None
        try:
            yield Running(int(process.stdout.readline()), process)
        finally:
            process.terminate()


def message(path: str, body: bytes, media: str = "application/json", method: str = "POST") -> bytes:
    """A request on the wire."""
    head = f"{method} {path} HTTP/1.1\r\nhost: bench\r\ncontent-type: {media}\r\n"
    return f"{head}content-length: {len(body)}\r\n\r\n".encode() + body


class Connection:
    """One connection that is kept open."""

    def __init__(self, reader: asyncio.StreamReader, writer: asyncio.StreamWriter) -> None:
        self.reader, self.writer = reader, writer

    @classmethod
    async def open(cls, port: int) -> Connection:
        return cls(*await asyncio.open_connection("127.0.0.1", port, limit=2**26))

    async def ask(self, wire: bytes) -> tuple[int, int]:
        """Status and length of the answer to a request."""
        self.writer.write(wire)
        await self.writer.drain()
        head = (await self.reader.readuntil(b"\r\n\r\n")).lower()
        status = int(head.split(b" ", 2)[1])
        if b"content-length: " in head:
            length = int(head.split(b"content-length: ")[1].split(b"\r\n")[0])
            await self.reader.readexactly(length)
            return status, length
        length = 0
        while size := int(await self.reader.readuntil(b"\r\n"), 16):
            await self.reader.readexactly(size + 2)
            length += size
        await self.reader.readexactly(2)
        return status, length


async def rate(port: int, wire: bytes, seconds: float, connections: int = 8) -> float:
    """Answers per second over some connections."""
    end = time.perf_counter() + seconds
    done = 0

    async def client() -> None:
        nonlocal done
        connection = await Connection.open(port)
        while time.perf_counter() < end:
            status, _ = await connection.ask(wire)
            assert status == 200
            done += 1

    start = time.perf_counter()
    await asyncio.gather(*(client() for _ in range(connections)))
    return done / (time.perf_counter() - start)


def body_of(request: Any) -> bytes:
    """A request as a body."""
    return json.dumps(request).encode()


def main() -> None:
    """Serve on a free port and print it."""
    config = uvicorn.Config(application(), port=0, log_level="warning", server_header=False)
    listener = config.bind_socket()
    listener.listen()
    print(listener.getsockname()[1], flush=True)
    uvicorn.Server(config).run(sockets=[listener])


if __name__ == "__main__":
    main()
