"""Speed of the engine: one evaluation, arrays, and the ratio to the plain scalar implementation.

Run with ``python -m tests.bench.speed``. Everything is measured in one run and printed; nothing is
asserted, because a time depends on the machine.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable

import numpy as np

from service.assess.evaluate import evaluate
from service.assess.lines import Lines
from service.contract.answer import answer, rule_sets
from service.contract.request import EvaluationRequest
from tests.assess.test_differential import arrays, draw
from tests.reference import plain

CHUNK = 32768
LINES = 1_000_000
PLAIN_LINES = 2000


def best(run: Callable[[], object], repeats: int) -> float:
    """Least time of several runs [s]."""
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        run()
        times.append(time.perf_counter() - start)
    return min(times)


def take(lines: Lines, index: np.ndarray) -> Lines:
    """A batch of chosen lines, each a laser of its own."""
    columns = [getattr(lines, name)[index] for name in Lines.__slots__ if name not in ("laser", "beams")]
    return Lines(np.arange(len(index)), *columns, lines.beams.take(index))


def main() -> None:
    """Measure and print."""
    rules = rule_sets()["icnirp-2013"]
    drawn = draw(PLAIN_LINES, seed=5, elliptical=False)
    sample = arrays(drawn)
    rng = np.random.default_rng(7)
    chunks = [
        take(sample, rng.integers(PLAIN_LINES, size=min(CHUNK, LINES - start)))
        for start in range(0, LINES, CHUNK)
    ]

    def all_chunks() -> None:
        for chunk in chunks:
            evaluate(chunk, rules)

    evaluate(chunks[0], rules)
    per_second = LINES / best(all_chunks, 2)
    single = {}
    for number, name in enumerate(("cw", "pulse", "train")):
        one = take(sample, np.flatnonzero(sample.mode == number)[:1])
        evaluate(one, rules)
        single[name] = best(lambda one=one: [evaluate(one, rules) for _ in range(200)], 5) / 200
    body = {
        "lines": [
            {
                "wavelength_nm": 532,
                "emission": {"mode": "cw", "power_w": 0.1},
                "beam": {"diameter_mm": 2.0, "divergence_mrad": 1.0},
            }
        ]
    }
    request = EvaluationRequest.model_validate(body)
    whole = best(lambda: [answer(request).model_dump_json() for _ in range(100)], 5) / 100
    scalar = best(lambda: [plain.evaluate("icnirp-2013", line) for line in drawn], 2) / PLAIN_LINES
    print(f"python {sys.version.split()[0]}, numpy {np.__version__}, {LINES} mixed lines, round beams")
    for name, seconds in single.items():
        print(f"one evaluation, {name}: {seconds * 1e6:.0f} us")
    print(f"one answer with working, as JSON: {whole * 1e6:.0f} us")
    print(f"arrays: {per_second:,.0f} lines/s, all criteria, eye and skin, distances")
    print(f"plain scalar implementation: {1 / scalar:,.0f} lines/s")
    print(f"ratio arrays / plain scalar: {per_second * scalar:.0f}")


if __name__ == "__main__":
    main()
