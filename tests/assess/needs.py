"""Lasers and pairs for the checks of protection: requests to needs, without going through pages."""

from __future__ import annotations

from typing import Any

from service.assess.scales import AlignmentNeed, ScaleNeed, alignment_need, scale_needs
from service.contract.answer import answer, rule_sets
from service.contract.convert import lines_of
from service.contract.protection import PairCheck, Protection
from service.contract.request import EvaluationRequest
from service.files import DATA
from service.rules.eyewear import eyewear_tables

__all__ = ["aligning", "cw", "line", "needs", "pair", "protection", "pulse", "train", "verdicts"]


def cw(power_w: float) -> dict[str, Any]:
    return {"mode": "cw", "power_w": power_w}


def pulse(energy_j: float, pulse_s: float) -> dict[str, Any]:
    return {"mode": "pulse", "energy_j": energy_j, "pulse_s": pulse_s}


def train(energy_j: float, pulse_s: float, rate_hz: float) -> dict[str, Any]:
    return {"mode": "train", "energy_j": energy_j, "pulse_s": pulse_s, "rate_hz": rate_hz}


def line(wavelength_nm: float, emission: dict[str, Any], **beam: Any) -> dict[str, Any]:
    """One line; a beam of 2 mm and 1 mrad at 1/e2 unless its fields are given."""
    return {
        "wavelength_nm": wavelength_nm,
        "emission": emission,
        "beam": {"diameter_mm": 2.0, "divergence_mrad": 1.0, **beam},
    }


def _lines(lines: tuple[dict[str, Any], ...]) -> Any:
    request = EvaluationRequest.model_validate({"lines": list(lines)})
    return lines_of([request], rule_sets()[request.rules])[0]


def needs(only: dict[str, Any], distance_m: float = 0.0) -> list[ScaleNeed]:
    """What the modes of one line ask for."""
    return scale_needs(_lines((only,)), 0, distance_m, eyewear_tables(DATA))


def aligning(only: dict[str, Any], distance_m: float = 0.0) -> AlignmentNeed | None:
    return alignment_need(_lines((only,)), 0, distance_m, eyewear_tables(DATA))


def pair(name: str, *ranges: tuple[Any, ...], light: float | None = None) -> dict[str, Any]:
    """A pair: ranges as (from, to, density or None, marking or None)."""
    found = []
    for low, high, density, marking in ranges:
        entry = {"from_nm": low, "to_nm": high, "optical_density": density, "marking": marking}
        found.append({k: v for k, v in entry.items() if v is not None})
    made: dict[str, Any] = {"name": name, "ranges": found}
    return made if light is None else {**made, "luminous_transmittance": light}


def protection(*lines: dict[str, Any], **more: Any) -> Protection:
    """The protection part of the answer."""
    return answer(EvaluationRequest.model_validate({"lines": list(lines), **more})).protection


def verdicts(pairs: list[dict[str, Any]], *lines: dict[str, Any], **more: Any) -> list[PairCheck]:
    """Verdicts on pairs, in the order given."""
    return protection(*lines, eyewear=pairs, **more).eyewear
