"""An invented inventory: mostly round beams of one line, some elliptical, every mode, common wavelengths."""

from __future__ import annotations

import json
import random
from collections.abc import Iterator
from typing import Any

__all__ = ["lasers", "ndjson"]

WAVELENGTHS = (266, 355, 405, 450, 532, 633, 650, 780, 808, 976, 1064, 1064, 1550, 1940, 10600)


def lasers(count: int, seed: int = 1) -> Iterator[dict[str, Any]]:
    """Requests of one line each."""
    draw = random.Random(seed)

    def spread(low: float, high: float) -> float:
        return float(10 ** draw.uniform(low, high))

    for number in range(count):
        mode = draw.choice(("cw", "cw", "cw", "pulse", "train"))
        emission: dict[str, Any] = {"mode": mode}
        if mode == "cw":
            emission["power_w"] = spread(-3, 1)
        elif mode == "pulse":
            emission |= {"energy_j": spread(-6, -1), "pulse_s": spread(-9, -3)}
        else:
            emission |= {"energy_j": spread(-8, -3), "pulse_s": spread(-12.9, -7), "rate_hz": spread(1, 7)}
        diameter: Any = round(draw.uniform(0.5, 8), 2)
        if draw.random() < 0.1:
            diameter = [diameter, round(diameter * draw.uniform(1.5, 4), 2)]
        beam = {"diameter_mm": diameter, "divergence_mrad": round(draw.uniform(0.2, 3), 2)}
        line = {"wavelength_nm": draw.choice(WAVELENGTHS), "emission": emission, "beam": beam}
        yield {"label": f"laser {number}", "lines": [line]}


def ndjson(count: int, seed: int = 1) -> bytes:
    """The same as lines."""
    return b"".join(json.dumps(laser).encode() + b"\n" for laser in lasers(count, seed))
