"""Resonators to start from, and random ones."""

from __future__ import annotations

from typing import Any

import numpy as np

from service.optics.gain_bounds import Media, Pumps
from service.optics.rate_equations import Resonators

__all__ = ["BODY", "four_level_lasers", "resonator"]

#: An invented rod laser: 20 W of diode light on Nd:YAG.
BODY: dict[str, Any] = {
    "label": "Rod laser",
    "medium": "nd-yag",
    "pump": {"mode": "cw", "power_w": 20.0},
    "resonator": {
        "length_mm": 250.0,
        "output_reflectance": 0.9,
        "mode_diameter_mm": 0.8,
        "medium_length_mm": 50.0,
    },
}


def resonator(**more: float) -> Resonators:
    """One resonator."""
    values = {
        "wavelength_m": 1064e-9,
        "cross_section_m2": 2.8e-23,
        "lifetime_s": 230e-6,
        "ions": np.inf,
        "lower_ratio": 0.0,
        "mode_area_m2": 5e-7,
        "length_m": 0.25,
        "output_reflectance": 0.9,
        "rear_reflectance": 1.0,
        "loss": 0.02,
        **more,
    }
    return Resonators(**{name: np.array([value]) for name, value in values.items()})


def four_level_lasers(count: int, seed: int) -> tuple[Resonators, Pumps, Media]:
    """Random four-level lasers, their pumps 1.2 to 100 times above threshold, some with few ions."""
    draw = np.random.default_rng(seed)
    laser = Resonators(
        wavelength_m=draw.uniform(300e-9, 5e-6, count),
        cross_section_m2=10.0 ** draw.uniform(-24.5, -21.0, count),
        lifetime_s=10.0 ** draw.uniform(-5.5, -2.0, count),
        ions=np.full(count, np.inf),
        lower_ratio=np.zeros(count),
        mode_area_m2=10.0 ** draw.uniform(-8.0, -4.0, count),
        length_m=10.0 ** draw.uniform(-2.0, 0.3, count),
        output_reflectance=draw.uniform(0.04, 0.995, count),
        rear_reflectance=draw.uniform(0.9, 1.0, count),
        loss=draw.uniform(0.0, 0.3, count),
    )
    upper = 10.0 ** draw.uniform(0.08, 2.0, count) * laser.threshold_inversion
    some = draw.random(count) < 0.5
    laser.ions[some] = upper[some] * 10.0 ** draw.uniform(0.05, 2.0, some.sum())
    whole = np.where(draw.random(count) < 0.5, laser.ions, np.inf)
    pump = Pumps(
        photons_per_s=upper / laser.lifetime_s,
        pulse_s=np.full(count, np.inf),
        period_s=np.full(count, np.inf),
        hold_s=np.full(count, np.inf),
        open_s=laser.photon_lifetime_s * 10.0 ** draw.uniform(1.5, 3.5, count),
    )
    return laser, pump, Media(whole, np.full(count, 0.05), np.full(count, 1e-3))
