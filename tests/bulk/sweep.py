"""A tolerance study in parts, as a cluster's processes import it."""

from __future__ import annotations

import os
from collections.abc import Mapping
from typing import Any

import numpy as np

ROWS = 3000


def make(part: int) -> dict[str, Any]:
    """Power and divergence of one laser, drawn around the values of its data sheet."""
    draw = np.random.default_rng(part)
    return {
        "wavelength_nm": 532.0,
        "mode": "cw",
        "power_w": 0.1 * draw.uniform(0.8, 1.2, ROWS),
        "diameter_mm": 2.0,
        "divergence_mrad": draw.uniform(0.8, 1.2, ROWS),
        "exposure_s": 0.25,
    }


def keep(columns: Mapping[str, Any], found: dict[str, Any]) -> tuple[int, int, float, float]:
    """Rows, the process, and the longest and shortest distance of a part."""
    far = found["eye_hazard_distance_m"]
    assert not any(found["problem"])
    return len(columns["power_w"]), os.getpid(), float(far.max()), float(far.min())
