"""How a published value is asked of the service: through the contract, or of beams and factors alone.

Every reader takes the `ask` of a check and returns one value in SI (optical density and scale numbers as
such). Through the contract a laser is one line; without `beam` it is a beam much narrower than any
limiting aperture, so that all of it enters.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numpy as np

from service.assess.evaluate import optical_density
from service.contract.answer import answer, rule_set
from service.contract.evaluation import EvaluationResult
from service.contract.request import EvaluationRequest
from service.contract.result import Criterion, TargetAnswer
from service.files import DATA
from service.optics.beams import SQRT2, Beams
from service.optics.encircled import encircled_fraction, round_diameter
from service.rules.eyewear import eyewear_tables

__all__ = ["READERS", "request_of"]

NARROW = {"diameter_mm": 0.01, "divergence_mrad": 1.0, "level": "1/e"}
POWER_W, ENERGY_J = 1e-3, 1e-6
Ask = dict[str, Any]


def request_of(ask: Ask) -> dict[str, Any]:
    """The request of contract v1 that a check stands for."""
    emission: dict[str, Any] = {"mode": "cw", "power_w": ask.get("power_w", POWER_W)}
    if "pulse_s" in ask:
        emission = {"mode": "pulse", "pulse_s": ask["pulse_s"], "energy_j": ask.get("energy_j", ENERGY_J)}
    if "rate_hz" in ask:
        emission |= {"mode": "train", "rate_hz": ask["rate_hz"]}
    return {
        "rules": ask["rules"],
        "exposure_s": ask.get("exposure_s"),
        "lines": [
            {
                "wavelength_nm": ask["wavelength_nm"],
                "emission": emission,
                "beam": ask.get("beam", NARROW),
                "subtense_mrad": ask.get("subtense_mrad", 1.5),
            }
        ],
        "bench": ask.get("bench", []),
    }


def _answer(ask: Ask) -> EvaluationResult:
    return answer(EvaluationRequest.model_validate(request_of(ask)))


def _target(ask: Ask) -> TargetAnswer:
    result = _answer(ask)
    return result.skin if ask.get("target") == "skin" else result.eye


def _strictest(ask: Ask) -> Criterion:
    return min(_target(ask).criteria, key=lambda c: c.limit_j_m2)


def _area_m2(diameter_m: float) -> float:
    return math.pi / 4 * diameter_m**2


def _allowed(ask: Ask) -> float:
    """Largest power [W] or energy of a pulse [J] that may enter the aperture, times `scale`."""
    emitted = ENERGY_J if "pulse_s" in ask else POWER_W
    return emitted / _target(ask).hazard_ratio * float(ask.get("scale", 1.0))


def _irradiance(ask: Ask) -> float:
    """Exposure over duration [W/m2], averaged over the limiting aperture."""
    return float(_target(ask).criteria[0].exposure_j_m2 / ask["exposure_s"])


def _energy(ask: Ask) -> float:
    """Energy that enters the limiting aperture [J]."""
    row = _target(ask).criteria[0]
    return row.exposure_j_m2 * _area_m2(row.aperture_mm * 1e-3)


def _distance(ask: Ask) -> float:
    found = _target(ask).hazard_distance_m
    return math.inf if found is None else found


def _pulse_factor(ask: Ask) -> float:
    """Smallest C_P of the rows that hold; 1 where none asks for it."""
    found = (c.pulse_factor for c in _target(ask).criteria if c.rule == "train")
    return min((f for f in found if f is not None), default=1.0)


def _class_end(ask: Ask) -> float:
    """Largest power [W] at which the limits of a class hold."""
    (scheme,) = (c for c in _answer(ask).classification if c.scheme == ask["scheme"])
    (level,) = (x for x in scheme.levels if x.limits == ask["limits"])
    return POWER_W / level.ratio


def _scale_number(ask: Ask) -> float:
    """Scale number at the exit, the size factor of wide beams included."""
    (found,) = _answer(ask).protection.lines[0].worst_place.scale_numbers
    return float(found.scale_number_wide_beam)


def _scale_top(ask: Ask) -> float:
    """Largest irradiance [W/m2] that a scale number withstands, by the table."""
    row = eyewear_tables(DATA).scale(ask["mode"], ask["wavelength_nm"])
    return float(row.coefficient * 10.0 ** (ask["scale_number"] + row.exponent_offset))


def _factor(ask: Ask) -> float:
    """A named factor of a rule set, in the unit of its table times `scale`."""
    found = rule_set(ask["rules"]).factors[ask["factor"]](np.array([float(ask["at"])]))[0]
    return float(found) * float(ask.get("scale", 1.0))


def _crossover(ask: Ask) -> float:
    """Time [s] at which the thermal limit k t^0.25, asked at 2 ns, grows to the photochemical one at 5 s."""
    thermal, photochemical = (_strictest({**ask, "pulse_s": t}).limit_j_m2 for t in (2e-9, 5.0))
    return float(2e-9 * (photochemical / thermal) ** 4)


def _beams(diameter_m: float, divergence_rad: float, tophat: bool = False) -> Beams:
    """One round beam; diameter and divergence at 1/e, or of a top hat."""
    columns = [np.array([x]) for x in (diameter_m, diameter_m, divergence_rad, divergence_rad, 0.0)]
    return Beams.with_waist(np.array([tophat]), *columns)


def _share(ask: Ask) -> float:
    """Share of a round Gaussian beam inside an aperture, its diameter in radii at 1/e2."""
    width = np.array([2.0 / SQRT2])
    aperture = np.array([float(ask["aperture_over_radius"])])
    return float(encircled_fraction(aperture, width, width, np.array([False]))[0])


def _level_ratio(ask: Ask) -> float:
    """Diameter at 1/e2 over diameter at 1/e: the share inside the first is 1 - exp(-2)."""
    return float(2.0 / round_diameter(np.array([2.0]), np.array([1 - math.exp(-2)]), np.array([False]))[0])


def _mean_irradiance(ask: Ask) -> float:
    """Mean irradiance of a flat spot [W/m2] in an aperture narrower than it."""
    spot = _beams(ask["diameter_m"], 1e-3, tophat=True)
    inside = spot.fraction(np.array([ask["aperture_m"]]), np.zeros(1))[0]
    return float(ask["power_w"] * inside / _area_m2(ask["aperture_m"]))


def _reach(ask: Ask) -> float:
    """Distance [m] at which the irradiance, averaged over an aperture, falls to a stated value."""
    share = ask["irradiance_w_m2"] * _area_m2(ask["aperture_m"]) / ask["power_w"]
    beam = _beams(ask["diameter_m"], ask["divergence_rad"])
    return float(beam.reach_m(np.array([ask["aperture_m"]]), np.array([share]))[1][0])


def _density(ask: Ask) -> float:
    """Optical density of a narrow beam against a stated limit averaged over an aperture."""
    inside = _beams(1e-5, 1e-3).fraction(np.array([ask["aperture_m"]]), np.zeros(1))
    exposed = ask["power_w"] * inside / _area_m2(ask["aperture_m"])
    return float(optical_density(exposed / ask["irradiance_w_m2"])[0])


#: Reader by the name that `ask.read` gives.
READERS: dict[str, Callable[[Ask], float]] = {
    "allowed": _allowed,
    "aperture_mm": lambda ask: _strictest(ask).aperture_mm,
    "class_end": _class_end,
    "crossover": _crossover,
    "density": _density,
    "energy": _energy,
    "factor": _factor,
    "hazard_distance_m": _distance,
    "irradiance": _irradiance,
    "level_ratio": _level_ratio,
    "limit_j_m2": lambda ask: _strictest(ask).limit_j_m2,
    "limit_w_m2": lambda ask: _strictest(ask).limit_w_m2,
    "mean_irradiance": _mean_irradiance,
    "optical_density": lambda ask: _target(ask).optical_density,
    "pulse_factor": _pulse_factor,
    "reach": _reach,
    "scale_number": _scale_number,
    "scale_top": _scale_top,
    "share": _share,
}
