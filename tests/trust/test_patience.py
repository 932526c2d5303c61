"""Connections whose head never comes, over a real socket; a client in good time is not cut off."""

from __future__ import annotations

import os
import socket
import subprocess
import sys
from collections.abc import Iterator

import pytest


@pytest.fixture(scope="module")
def port() -> Iterator[int]:
    command = [sys.executable, "-m", "service.cli", "serve", "--port", "0"]
    environment = {**os.environ, "BLINKLINE_REQUEST_TIME": "1"}
    with subprocess.Popen(command, env=environment, stdout=subprocess.PIPE, text=True) as process:
        assert process.stdout is not None
        yield int(process.stdout.readline().rpartition(":")[2])
        process.terminate()


def received(line: socket.socket) -> bytes:
    """Everything up to the end of the connection."""
    line.settimeout(20)
    found = b""
    while part := line.recv(65536):
        found += part
    return found


HEAD = b"POST /api/v1/evaluate HTTP/1.1\r\nhost: a\r\ncontent-type: application/json\r\n"


@pytest.mark.parametrize("said", [b"", b"GET", HEAD], ids=["nothing", "one word", "half a head"])
def test_a_head_that_does_not_come(port: int, said: bytes) -> None:
    with socket.create_connection(("127.0.0.1", port)) as line:
        line.sendall(said)
        assert received(line) == b""


def test_a_body_that_does_not_come(port: int) -> None:
    with socket.create_connection(("127.0.0.1", port)) as line:
        line.sendall(HEAD + b"content-length: 10\r\n\r\n{")
        answer = received(line)
    assert answer.startswith(b"HTTP/1.1 408 ")
    assert b"application/problem+json" in answer


def test_one_request_after_another_on_a_connection(port: int) -> None:
    with socket.create_connection(("127.0.0.1", port)) as line:
        for last in (b"", b"connection: close\r\n"):
            line.sendall(b"GET /health/live HTTP/1.1\r\nhost: a\r\n" + last + b"\r\n")
            if not last:
                line.settimeout(20)
                assert line.recv(65536).startswith(b"HTTP/1.1 200 ")
        assert b"HTTP/1.1 200 " in received(line)
