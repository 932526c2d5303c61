"""Speed of signs: one PDF when everything is warm, and signs a second on one core.

Run with ``python -m tests.bench.signs``. Every sign differs from the one before, so that nothing is taken
from a cache but fonts, symbol and template. All is measured in one run and printed; nothing is asserted.
"""

from __future__ import annotations

import statistics
import sys
import time
from itertools import cycle, islice, product

from service.contract.answer import answer
from tests.sign.lasers import LASERS, evaluation, result, sign

COUNT = 120
WANTED_PER_SECOND = 20.0
WANTED_MS = 100.0
ADDRESS = "https://blinkline.example/evaluate?" + "&".join(f"field-{k}=0.123" for k in range(16))


def main() -> None:
    """Measure and print."""
    kinds = product(("3B", "4", "2"), ("iso", "ansi"), ("A4", "A6"), (["en"], ["de", "en"]))
    jobs = list(islice(cycle(kinds), COUNT))
    for name in LASERS:
        sign(name).pdf()
    evaluated, content, set_ms, whole = [], [], [], []
    begun = time.process_time()
    for k, (name, family, sheet, languages) in enumerate(jobs):
        start = time.perf_counter()
        found = answer(evaluation(name))
        middle = time.perf_counter()
        options = {"family": family, "sheet": sheet, "languages": languages, "address": f"{ADDRESS}{k}"}
        made = sign(found, room=f"Room {k}", lso_name="A. Example", **options)
        before = time.perf_counter()
        made.pdf()
        after = time.perf_counter()
        evaluated.append(middle - start)
        content.append(before - middle)
        set_ms.append(after - before)
        whole.append(after - start)
    used = time.process_time() - begun
    print(f"{COUNT} different signs, {sys.platform}, Python {sys.version.split()[0]}")
    for words, times in (
        ("evaluation", evaluated),
        ("content, code and data", content),
        ("typesetting to PDF", set_ms),
        ("all of it", whole),
    ):
        middle_ms, worst_ms = statistics.median(times) * 1e3, max(times) * 1e3
        print(f"{words:24} median {middle_ms:6.1f} ms, worst {worst_ms:6.1f} ms")
    print(
        f"PDF of one sign, warm    {WANTED_MS / 1e3 / statistics.median(whole):.1f} times faster than wanted"
    )
    rate = COUNT / used
    print(f"signs a second, one core {rate:.1f}, {rate / WANTED_PER_SECOND:.2f} of what is wanted")
    same = sign(result("3B"), room="Room 1")
    same.pdf()
    start = time.perf_counter()
    same.pdf()
    print(f"the same sign again      {(time.perf_counter() - start) * 1e3:.1f} ms")


if __name__ == "__main__":
    main()
