"""Several workers on one register that is not there yet: tables are made once, and every write counts."""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import httpx

from tests.register.web import LASERS, laser
from tests.web.test_cli import serving

LASERS_MADE = 24


def test_workers_share_one_register(tmp_path: Path) -> None:
    settings = {"BLINKLINE_DATA_DIR": str(tmp_path / "data")}
    with serving(tmp_path, "--port", "0", "--workers", "2", **settings) as url:

        def store(number: int) -> int:
            return httpx.post(f"{url}{LASERS}", json=laser(f"W-{number}"), timeout=60).status_code

        with ThreadPoolExecutor(8) as pool:
            assert set(pool.map(store, range(LASERS_MADE))) == {201}
        counts = {httpx.get(f"{url}{LASERS}", timeout=60).json()["total"] for _ in range(8)}
    assert counts == {LASERS_MADE}
