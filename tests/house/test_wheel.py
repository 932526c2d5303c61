"""An installed wheel serves from any folder: tables and templates travel with it."""

from __future__ import annotations

import subprocess
import sys
import zipfile
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
CHECK = """
import asyncio, pathlib, service, service.files
from service.app import create_app
import httpx
assert str(service.files.DATA).startswith({folder!r}), service.files.DATA
async def main():
    transport = httpx.ASGITransport(app=create_app())
    async with httpx.AsyncClient(transport=transport, base_url="http://test") as client:
        beam = "wavelength_nm-1=532&mode-1=cw&power_w-1=0.1&diameter_mm-1=2&divergence_mrad-1=1"
        sheet = "/sign/sheet.pdf?v=1&lines=1&" + beam
        for path in ("/", "/rules", "/rules/eu-2006-25", "/health/ready", "/favicon.ico", sheet):
            answer = await client.get(path)
            assert answer.status_code == 200, (path, answer.text)
asyncio.run(main())
"""


def test_wheel_carries_everything(tmp_path: Path) -> None:
    built = subprocess.run(
        [
            sys.executable,
            "-m",
            "pip",
            "wheel",
            "-q",
            "--no-deps",
            "--no-build-isolation",
            "-w",
            tmp_path,
            ROOT,
        ],
        capture_output=True,
        text=True,
        check=False,
    )
    assert built.returncode == 0, built.stderr
    (wheel,) = tmp_path.glob("blinkline-*.whl")
    unpacked = tmp_path / "installed"
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(unpacked)
    elsewhere = tmp_path / "elsewhere"
    elsewhere.mkdir()
    code = f"import sys; sys.path.insert(0, {str(unpacked)!r})\n" + CHECK.format(folder=str(unpacked))
    done = subprocess.run(
        [sys.executable, "-I", "-c", code], cwd=elsewhere, capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr
