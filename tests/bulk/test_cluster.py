"""The columns function over two processes of a local cluster: the same figures as in one."""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Iterator
from concurrent.futures import Future, ThreadPoolExecutor
from pathlib import Path
from typing import Any

import pytest

from service.cluster import evaluate_parts
from service.columns import evaluate_columns
from tests.bulk.sweep import ROWS, keep, make

PARTS, PATIENCE_S = 6, 120
ROOT = Path(__file__).resolve().parents[2]
#: Run in a process of its own: a cluster leaves threads and event loops behind.
CLUSTER = """
import json
from distributed import Client, LocalCluster
from service.cluster import evaluate_parts
from tests.bulk.sweep import keep, make

if __name__ == "__main__":
    with LocalCluster(n_workers=2, threads_per_worker=1, dashboard_address=None) as cluster:
        with Client(cluster) as client:
            print(json.dumps(list(evaluate_parts(client, make, keep, %d, ahead=4))))
"""


def test_two_processes_give_the_figures_of_one(tmp_path: Path) -> None:
    script = tmp_path / "study.py"
    script.write_text(CLUSTER % PARTS, encoding="utf-8")
    done = subprocess.run(
        [sys.executable, script],
        cwd=tmp_path,
        env={"PYTHONPATH": str(ROOT), "PATH": ""},
        capture_output=True,
        text=True,
        timeout=PATIENCE_S,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    found = json.loads(done.stdout)
    assert len({process for _, process, _, _ in found}) == 2
    for part, (rows, _, longest, shortest) in enumerate(found):
        far = evaluate_columns(make(part))["eye_hazard_distance_m"]
        assert (rows, longest, shortest) == (ROWS, far.max(), far.min())


class Counting:
    """An executor that counts what is under way."""

    def __init__(self, pool: ThreadPoolExecutor) -> None:
        self.pool, self.submitted = pool, 0

    def submit(self, fn: Any, /, *args: Any) -> Future[Any]:
        self.submitted += 1
        return self.pool.submit(fn, *args)


def test_no_more_parts_than_wanted_are_under_way() -> None:
    with ThreadPoolExecutor(1) as pool:
        counting = Counting(pool)
        results: Iterator[Any] = evaluate_parts(counting, make, keep, 5, ahead=2)
        for taken in range(1, 6):
            next(results)
            assert counting.submitted <= min(5, taken + 1)
        with pytest.raises(StopIteration):
            next(results)
