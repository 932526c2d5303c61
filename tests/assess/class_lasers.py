"""Random lasers whose classes spread over a whole scheme, for plain and for array code."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from service.assess.lines import Lines
from tests.assess.test_differential import arrays, draw

__all__ = ["batch", "lasers"]

#: Ends of every band of limits, factors, measurement conditions and additivity [nm].
EDGES_NM = (
    *(180, 302.4, 302.5, 315, 400, 450, 500, 600, 700, 710, 800, 1050, 1060, 1150, 1200, 1250, 1400),
    *(1500, 1535, 1545, 1800, 2500, 2600, 4000, 1e5, 1e6),
)


def lasers(count: int, seed: int, elliptical: bool = False) -> list[list[dict]]:
    """One laser in ten has two or three lines; a third is visible, where most classes are.

    Powers reach from far below Class 1 to Class 4 in every band; a third of the beams is wide and
    parallel, as those are that differ with and without a telescope.
    """
    rng = np.random.default_rng(seed)

    def log(low: float, high: float) -> float:
        return float(10 ** rng.uniform(math.log10(low), math.log10(high)))

    sizes = [1 if rng.random() < 0.9 else int(rng.integers(2, 4)) for _ in range(count)]
    lines = draw(sum(sizes), seed, elliptical)
    for line in lines:
        if rng.random() < 0.35:
            line["wavelength_nm"] = log(400, 710)
        elif rng.random() < 0.15:
            line["wavelength_nm"] = log(1200, 1420)
        line["power_w"] = log(1e-8, 1e3)
        line["energy_j"] = log(1e-12, 10)
        if not elliptical and rng.random() < 0.3:
            line["diameter_m"], line["divergence_rad"] = log(5e-3, 0.06), log(1e-5, 1e-3)
        if line["mode"] == "pulse" and rng.random() < 0.15:
            line["pulse_s"] = log(10, 3e4)
        if rng.random() < 0.01:
            line["wavelength_nm"], line["pulse_s"] = float(rng.uniform(1535, 1545)), log(1e-13, 1e-7)
            line["rate_hz"] = min(line["rate_hz"], 1.0 / line["pulse_s"])
        # The subtense of a parallel beam is small; the drawn one stands for every other source.
        if rng.random() < 0.3:
            line["subtense_mrad"] = log(0.5, 1.5)
        assert all(abs(line["wavelength_nm"] / edge - 1) > 1e-9 for edge in EDGES_NM)
    ends = np.cumsum(sizes)
    return [lines[end - size : end] for end, size in zip(ends, sizes, strict=True)]


def batch(several: list[list[dict]]) -> Lines:
    """The lasers as arrays."""
    laser = np.repeat(np.arange(len(several)), [len(lines) for lines in several])
    return replace(arrays([line for lines in several for line in lines]), laser=laser)
