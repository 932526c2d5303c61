"""Speed of tolerances: draws of a three-line laser, beside the same number of single lines.

Run with ``python -m tests.bench.tolerance`` (pinned to one core where the system can). Everything is
measured in one run and printed; nothing is asserted.
"""

from __future__ import annotations

import os
import time
from collections.abc import Callable

from service.contract.tolerance import ToleranceRequest
from service.contract.tolerance_answer import tolerance

DRAWS = 100_000
LINES = [
    {
        "wavelength_nm": 532,
        "emission": {"mode": "cw", "power_w": 0.1},
        "beam": {"diameter_mm": 2.0, "divergence_mrad": 1.0},
    },
    {
        "wavelength_nm": 1064,
        "emission": {"mode": "train", "energy_j": 1e-4, "pulse_s": 1e-8, "rate_hz": 1e4},
        "beam": {"diameter_mm": 2.0, "divergence_mrad": 1.5},
    },
    {
        "wavelength_nm": 808,
        "emission": {"mode": "cw", "power_w": 1.0},
        "beam": {"diameter_mm": 5.0, "divergence_mrad": 20.0},
    },
]


def request(lines: list[dict[str, object]]) -> ToleranceRequest:
    """Every power, diameter and divergence with a tolerance."""
    tolerances = []
    for k, line in enumerate(lines):
        emission = line["emission"]
        assert isinstance(emission, dict)
        energy = "power_w" if "power_w" in emission else "energy_j"
        for field in (f"emission.{energy}", "beam.diameter_mm", "beam.divergence_mrad"):
            tolerances.append({"field": f"lines.{k}.{field}", "plus_minus_percent": 10, "meaning": "normal"})
    return ToleranceRequest.model_validate(
        {"evaluation": {"lines": lines}, "tolerances": tolerances, "draws": DRAWS}
    )


def best(run: Callable[[], object], repeats: int = 3) -> tuple[float, float]:
    """Least time on the wall and of the processor over several runs [s]."""
    wall, cpu = [], []
    for _ in range(repeats):
        start, used = time.perf_counter(), time.process_time()
        run()
        wall.append(time.perf_counter() - start)
        cpu.append(time.process_time() - used)
    return min(wall), min(cpu)


def main() -> None:
    """Measure and print."""
    if hasattr(os, "sched_setaffinity"):
        os.sched_setaffinity(0, {min(os.sched_getaffinity(0))})
    three, one = request(LINES), request(LINES[:1])
    tolerance(three)
    wall, cpu = best(lambda: tolerance(three))
    wall_one, cpu_one = best(lambda: tolerance(one))
    print(f"{DRAWS} draws of three lines, nine tolerances, one core: {wall:.2f} s, processor {cpu:.2f} s")
    print(f"{DRAWS} draws of one line, three tolerances: {wall_one:.2f} s, processor {cpu_one:.2f} s")
    print(f"ratio three lines / one line: {cpu / cpu_one:.1f}")


if __name__ == "__main__":
    main()
