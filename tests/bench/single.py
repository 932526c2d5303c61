"""One evaluation over HTTP against a bare endpoint with the same models, in one run.

Run with ``python -m tests.bench.single``.
"""

from __future__ import annotations

import asyncio

from tests.bench.wire import BARE, body_of, message, rate, running
from tests.web.client import EVALUATE, GOOD, laser

SECONDS, ROUNDS = 2.0, 3
TRAIN = laser(1064, {"mode": "train", "energy_j": 1e-4, "pulse_s": 1e-8, "rate_hz": 1000})


def main() -> None:
    """Measure in turns and print the medians and their ratio."""
    with running() as service:
        for name, body in (("continuous wave", GOOD), ("pulse train", TRAIN)):
            found: dict[str, list[float]] = {BARE: [], EVALUATE: []}
            for path in [BARE, EVALUATE] * ROUNDS:
                before = service.cpu_s()
                per_second = asyncio.run(rate(service.port, message(path, body_of(body)), SECONDS))
                cpu = (service.cpu_s() - before) / (per_second * SECONDS)
                found[path].append(cpu)
                print(f"{name} {path}: {per_second:.0f}/s, {1e6 * cpu:.0f} us of processor each")
            bare, whole = (sorted(found[path])[ROUNDS // 2] for path in (BARE, EVALUATE))
            print(f"{name}: throughput of the evaluation / of the bare endpoint = {bare / whole:.2f}")


if __name__ == "__main__":
    main()
