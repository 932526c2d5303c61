"""The console command in a process of its own."""

from __future__ import annotations

import os
import re
import socket
import subprocess
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import httpx
import pytest

from tests.web.client import EVALUATE, GOOD

COMMAND = Path(sys.executable).with_name("blinkline")
PATIENCE_S = 20


def environment(**more: str) -> dict[str, str]:
    """The environment without settings of the service, and those of this check."""
    kept = {k: v for k, v in os.environ.items() if not k.startswith("BLINKLINE_")}
    return {**kept, **more}


@contextmanager
def serving(folder: Path, *arguments: str, **settings: str) -> Iterator[str]:
    """The address at which the service answers, started in another folder."""
    process = subprocess.Popen(
        [COMMAND, "serve", *arguments],
        cwd=folder,
        env=environment(**settings),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )
    try:
        assert process.stdout is not None
        line = process.stdout.readline()
        match = re.fullmatch(r"Blinkline \S+ on (http://\S+:\d+)\n", line)
        assert match, (line, process.poll())
        yield match[1]
    finally:
        process.terminate()
        _, errors = process.communicate(timeout=PATIENCE_S)
    assert "Traceback" not in errors


def run(folder: Path, *arguments: str, **settings: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [COMMAND, *arguments],
        cwd=folder,
        env=environment(**settings),
        capture_output=True,
        text=True,
        timeout=PATIENCE_S,
        check=False,
    )


def assert_one_line(done: subprocess.CompletedProcess[str], *parts: str) -> None:
    """Exit code 2 and one line that says what is wrong."""
    assert done.returncode == 2, done.stderr
    assert done.stdout == ""
    (line,) = done.stderr.splitlines()
    assert line.startswith("blinkline: ")
    for part in parts:
        assert part in line


def test_serves_from_another_folder(tmp_path: Path) -> None:
    with serving(tmp_path, "--port", "0") as url:
        live = httpx.get(f"{url}/health/live", timeout=PATIENCE_S)
        answer = httpx.post(f"{url}{EVALUATE}", json=GOOD, timeout=PATIENCE_S)
        page = httpx.get(f"{url}/", timeout=PATIENCE_S)
    assert (live.status_code, live.json()) == (200, {"status": "live"})
    assert "server" not in live.headers
    assert answer.json()["eye"]["criteria"][0]["aperture_mm"] == 7.0
    assert page.status_code == 200
    assert list(tmp_path.iterdir()) == []


def test_port_zero_prints_the_port_taken(tmp_path: Path) -> None:
    with serving(tmp_path, "--port", "0") as url:
        assert int(url.rpartition(":")[2]) > 1023


def test_settings_are_read(tmp_path: Path) -> None:
    with serving(tmp_path, "--port", "0", BLINKLINE_BODY_LIMIT="100") as url:
        response = httpx.post(f"{url}{EVALUATE}", json=GOOD, timeout=PATIENCE_S)
    assert response.status_code == 413
    assert "100 bytes" in response.json()["detail"]


def test_the_limit_holds_on_the_wire_without_a_length(tmp_path: Path) -> None:
    def flood() -> Iterator[bytes]:
        for _ in range(10):
            yield b" " * 1000

    with serving(tmp_path, "--port", "0", BLINKLINE_BODY_LIMIT="5000") as url:
        headers = {"content-type": "application/json"}
        response = httpx.post(f"{url}{EVALUATE}", content=flood(), headers=headers, timeout=PATIENCE_S)
        after = httpx.get(f"{url}/health/live", timeout=PATIENCE_S)
    assert response.status_code == 413
    assert after.status_code == 200


def test_an_unknown_setting_is_refused(tmp_path: Path) -> None:
    assert_one_line(run(tmp_path, "serve", BLINKLINE_PROT="8000"), "BLINKLINE_PROT", "BLINKLINE_PORT")


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("BLINKLINE_PORT", "http"),
        ("BLINKLINE_PORT", "65536"),
        ("BLINKLINE_PORT", ""),
        ("BLINKLINE_BODY_LIMIT", "1MB"),
        ("BLINKLINE_BODY_LIMIT", "-1"),
        ("BLINKLINE_BODY_LIMIT", "0"),
        ("BLINKLINE_BODY_LIMIT", "²"),
    ],
)
def test_a_wrong_setting_is_refused(tmp_path: Path, name: str, value: str) -> None:
    assert_one_line(run(tmp_path, "serve", **{name: value}), name, "whole number")


def test_a_taken_port_is_told(tmp_path: Path) -> None:
    with socket.create_server(("127.0.0.1", 0)) as taken:
        port = str(taken.getsockname()[1])
        assert_one_line(run(tmp_path, "serve", "--port", port), port, "127.0.0.1")


@pytest.mark.parametrize("port", ["70000", "-1"])
def test_an_impossible_port_is_told(tmp_path: Path, port: str) -> None:
    assert_one_line(run(tmp_path, "serve", "--port", port), port)


@pytest.mark.parametrize("host", ["256.1.1.1", "no-such-host.invalid"])
def test_an_impossible_host_is_told(tmp_path: Path, host: str) -> None:
    assert_one_line(run(tmp_path, "serve", "--host", host, "--port", "0"), host)


def test_version(tmp_path: Path) -> None:
    done = run(tmp_path, "--version")
    assert done.returncode == 0
    assert re.fullmatch(r"blinkline \d+\.\d+\.\d+\n", done.stdout)


@pytest.mark.parametrize("arguments", [(), ("serv",), ("serve", "--prot", "1"), ("serve", "--port", "x")])
def test_unknown_arguments_are_refused(tmp_path: Path, arguments: tuple[str, ...]) -> None:
    done = run(tmp_path, *arguments)
    assert done.returncode == 2
    assert "usage: blinkline" in done.stderr
    assert "Traceback" not in done.stderr
