"""The product asked by the checks: through the contract for whole evaluations, through optics for beams."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from service.assess.evaluate import optical_density
from service.contract.answer import answer, rule_set
from service.contract.evaluation import EvaluationResult
from service.contract.request import EvaluationRequest
from service.contract.result import TargetAnswer
from service.optics.beams import Beams

__all__ = [
    "ANSI",
    "EU",
    "ICNIRP",
    "IEC",
    "beams",
    "cw",
    "density",
    "evaluate",
    "factor",
    "limit",
    "pulse",
    "reach_m",
    "train",
]

ICNIRP, EU, IEC, ANSI = "icnirp-2013", "eu-2006-25", "iec-60825-1-2014", "ansi-z136-1-2014"

#: A beam far narrower than any limiting aperture, so that all of it enters.
NARROW_MM = 0.01


def cw(power_w: float = 1e-3) -> dict[str, Any]:
    return {"mode": "cw", "power_w": power_w}


def pulse(pulse_s: float, energy_j: float = 1e-6) -> dict[str, Any]:
    return {"mode": "pulse", "pulse_s": pulse_s, "energy_j": energy_j}


def train(pulse_s: float, rate_hz: float, energy_j: float = 1e-6) -> dict[str, Any]:
    return {"mode": "train", "pulse_s": pulse_s, "rate_hz": rate_hz, "energy_j": energy_j}


def evaluate(
    rules: str,
    wavelength_nm: float,
    emission: dict[str, Any],
    exposure_s: float | None = None,
    subtense_mrad: float = 1.5,
    **beam: Any,
) -> EvaluationResult:
    """The answer of contract v1 for one line; the beam is narrow unless its fields are given."""
    request = {
        "rules": rules,
        "exposure_s": exposure_s,
        "lines": [
            {
                "wavelength_nm": wavelength_nm,
                "emission": emission,
                "beam": {"diameter_mm": NARROW_MM, "divergence_mrad": 1.0, "level": "1/e", **beam},
                "subtense_mrad": subtense_mrad,
            }
        ],
    }
    return answer(EvaluationRequest.model_validate(request))


def target(result: EvaluationResult, name: str) -> TargetAnswer:
    return result.skin if name == "skin" else result.eye


def limit(
    rules: str,
    wavelength_nm: float,
    emission: dict[str, Any],
    exposure_s: float | None = None,
    name: str = "eye",
) -> tuple[float, float]:
    """The strictest limit of a small source: [J/m2], and [W/m2] over the exposure or the pulse."""
    criteria = target(evaluate(rules, wavelength_nm, emission, exposure_s), name).criteria
    strictest = min(criteria, key=lambda c: c.limit_j_m2)
    return strictest.limit_j_m2, strictest.limit_w_m2


def factor(rules: str, name: str, x: float) -> float:
    """A named factor of a rule set, in the unit of its table."""
    return float(rule_set(rules).factors[name](np.array([x]))[0])


def beams(diameter_m: float, divergence_rad: float, waist_m: float = 0.0, tophat: bool = False) -> Beams:
    """One round beam; diameter and divergence at 1/e, or of a top hat."""
    columns = [np.array([x]) for x in (diameter_m, diameter_m, divergence_rad, divergence_rad, waist_m)]
    return Beams.with_waist(np.array([tophat]), *columns)


def reach_m(
    power_w: float, irradiance_w_m2: float, diameter_m: float, divergence_rad: float, aperture_m: float = 7e-3
) -> float:
    """Distance [m] at which a round beam's irradiance, averaged over the aperture, falls to a value."""
    share = irradiance_w_m2 * math.pi / 4 * aperture_m**2 / power_w
    near, far = beams(diameter_m, divergence_rad).reach_m(np.array([aperture_m]), np.array([share]))
    assert near[0] == far[0]
    return float(far[0])


def density(power_w: float, irradiance_w_m2: float, aperture_m: float) -> float:
    """Optical density for a narrow beam against a stated limit [W/m2] averaged over an aperture [m]."""
    inside = beams(NARROW_MM * 1e-3, 1e-3).fraction(np.array([aperture_m]), np.zeros(1))
    exposed = power_w * inside / (math.pi / 4 * aperture_m**2)
    return float(optical_density(exposed / irradiance_w_m2)[0])
