"""What cannot be used is named at the start, in one line and without a trace."""

from __future__ import annotations

import os
import shutil
import socket
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]


def start(folder: Path, *arguments: str, **environment: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "service.cli", "serve", *arguments],
        cwd=folder,
        env={**os.environ, **environment, "PYTHONPATH": str(folder), "PYTHONDONTWRITEBYTECODE": "1"},
        capture_output=True,
        text=True,
        check=False,
        timeout=60,
    )


@pytest.fixture
def copy(tmp_path: Path) -> Path:
    for folder in ("service", "data", "templates"):
        shutil.copytree(ROOT / folder, tmp_path / folder)
    return tmp_path


def one_line(done: subprocess.CompletedProcess[str]) -> str:
    assert done.returncode == 2, done.stderr
    (line,) = done.stderr.splitlines()
    assert line.startswith("blinkline: ")
    return line


def test_no_data(copy: Path) -> None:
    shutil.rmtree(copy / "data")
    assert "data is missing or cannot be read" in one_line(start(copy))


def test_a_file_of_a_rule_set_is_missing(copy: Path) -> None:
    (copy / "data" / "rules" / "icnirp-2013" / "limits.csv").unlink()
    assert "icnirp-2013/limits.csv" in one_line(start(copy))


def test_a_faulty_row(copy: Path) -> None:
    table = copy / "data" / "rules" / "icnirp-2013" / "limits.csv"
    table.write_text(table.read_text(encoding="utf-8").replace("3e10", "thirty", 1), encoding="utf-8")
    assert "icnirp-2013/limits.csv, line 2: coefficient is 'thirty'" in one_line(start(copy))


def test_a_port_in_use() -> None:
    with socket.socket() as taken:
        taken.bind(("127.0.0.1", 0))
        taken.listen()
        port = str(taken.getsockname()[1])
        assert f"cannot listen on 127.0.0.1 port {port}" in one_line(start(ROOT, "--port", port))


def test_a_misspelt_setting() -> None:
    assert "BLINKLINE_ALOWED_HOSTS is no setting" in one_line(start(ROOT, BLINKLINE_ALOWED_HOSTS="x"))
