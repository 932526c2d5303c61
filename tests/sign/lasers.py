"""One invented laser of every class, and the way from a request to its sign."""

from __future__ import annotations

from datetime import date
from functools import cache
from typing import Any

from service.contract.answer import answer
from service.contract.evaluation import EvaluationResult
from service.contract.request import EvaluationRequest
from service.sign.content import SignContent, SiteDefaults, sign_content
from service.sign.request import SignOptions
from service.web.sign_sheet import SetSign, sign_on_sheet

__all__ = ["CLASSES", "LASERS", "TODAY", "US_CLASSES", "content", "evaluation", "line", "result", "sign"]

TODAY = date(2026, 12, 1)


def line(wavelength_nm: float, emission: dict[str, Any], diameter_mm: float = 2.0, mrad: float = 1.0) -> Any:
    beam = {"diameter_mm": diameter_mm, "divergence_mrad": mrad}
    return {"wavelength_nm": wavelength_nm, "emission": emission, "beam": beam}


def cw(power_w: float) -> dict[str, Any]:
    return {"mode": "cw", "power_w": power_w}


#: By class after IEC 60825-1; the test of this folder checks that each is what it says.
LASERS: dict[str, dict[str, Any]] = {
    "1": {"label": "Fibre tester", "lines": [line(532, cw(1e-4))]},
    "1M": {"label": "Wide survey beam", "lines": [line(808, cw(0.01), 60.0, 0.1)]},
    "2": {"label": "Line projector", "lines": [line(650, cw(8e-4))]},
    "2M": {"label": "Wide levelling beam", "lines": [line(650, cw(0.02), 50.0, 0.1)]},
    "3R": {"label": "Alignment pointer", "lines": [line(532, cw(4e-3))]},
    "3B": {"label": "Bench 4 alignment beam", "lines": [line(532, cw(0.1))]},
    "4": {
        "label": "Twin-line pulsed source",
        "lines": [
            line(1064, {"mode": "train", "energy_j": 0.35, "pulse_s": 8e-9, "rate_hz": 10}, 6.0, 0.5),
            line(532, {"mode": "train", "average_power_w": 1.7, "pulse_s": 8e-9, "rate_hz": 10}, 6.0, 0.5),
        ],
    },
}
CLASSES = tuple(LASERS)
US_CLASSES = ("I", "IIa", "II", "IIIa", "IIIb", "IV")


def evaluation(hazard_class: str) -> EvaluationRequest:
    return EvaluationRequest.model_validate(LASERS[hazard_class])


@cache
def result(hazard_class: str) -> EvaluationResult:
    return answer(evaluation(hazard_class))


def content(found: EvaluationResult | str, site: SiteDefaults | None = None, **options: Any) -> SignContent:
    """What the sign of a laser, or of a class, says."""
    found = result(found) if isinstance(found, str) else found
    return sign_content(found, SignOptions.model_validate(options), site or SiteDefaults(), TODAY)


def sign(found: EvaluationResult | str, site: SiteDefaults | None = None, **options: Any) -> SetSign:
    """The sign on its sheet."""
    return sign_on_sheet(content(found, site, **options), SignOptions.model_validate(options))
