"""Pages, live answer and report tell the worst case: lines that add, optical aids, sweeps that stop."""

from __future__ import annotations

import math
from datetime import date
from typing import Any

import pytest

from service.contract.answer import answer
from service.contract.evaluation import EvaluationResult
from service.contract.request import EvaluationRequest
from service.web import present
from service.web.chart import chart_of
from service.web.report import report_data
from tests.web.client import laser
from tests.web.test_report import cells, request_for

#: 18 t^0.75 J/m2 over 0.25 s through a pupil of 7 mm (ICNIRP 2013, Table 5) [W].
ALLOWED_W = 18.0 * 0.25**-0.25 * math.pi / 4 * 7e-3**2
AID = {"objective_mm": 50.0, "magnification": 7.0}
SCANNER = {"element": "scanner", "angle_deg": 30.0, "sweeps_hz": 100.0}


def found(body: dict[str, Any]) -> EvaluationResult:
    return answer(EvaluationRequest.model_validate(body))


def green(power_w: float, **more: Any) -> dict[str, Any]:
    return laser(532, {"mode": "cw", "power_w": power_w}, **more)


def printed(body: dict[str, Any]) -> str:
    return "\n".join(cells(report_data(request_for(body), date(2026, 12, 1))))


def test_lines_that_exceed_the_limit_only_together_need_a_filter() -> None:
    """Each at 0.8 of the limit, both at 1.6: as each line counts twice, log10 1.6 = 0.2041 for both."""
    one = green(0.8 * ALLOWED_W)["lines"][0]
    body = {"lines": [one, {**one, "wavelength_nm": 600}]}
    result = found(body)
    assert result.eye.hazard_ratio == pytest.approx(1.6, rel=1e-6)
    said = present.eyewear_sentence(result)
    assert said.startswith("Where the beam is worst it needs optical density 0.205 at 532 nm and")
    assert "room for the lines that add" in said
    assert said in printed(body)


def test_behind_an_aid_eyewear_needs_what_the_aided_eye_needs() -> None:
    """0.1 W over 100 mm (1/e2): 49 mm gather 1 - exp(-2 x 0.49^2) = 0.3813 of it, 38.9 times the limit."""
    body = green(0.1, diameter_mm=100.0, viewing={"aid": AID})
    result = found(body)
    need = result.protection.lines[0].behind_aid
    assert need is not None
    gathered = 0.1 * -math.expm1(-2 * 0.49**2)
    assert need.optical_density == pytest.approx(math.log10(gathered / ALLOWED_W), abs=1e-6)
    assert need.optical_density > result.protection.lines[0].worst_place.optical_density + 1.5
    said = present.eyewear_sentence(result)
    assert said.startswith("Where the beam is worst it needs optical density 1.60 at 532 nm, behind")
    assert said in printed(body)
    assert "532 nm, behind the optics" in printed(body)


def test_live_answer_and_report_tell_of_the_aid_and_of_a_sweep_that_stops() -> None:
    """5 W behind 7 x 50 binoculars, stopped: 4950.4 m ( 0.049 sqrt(-2 / ln(1 - 0.97966 mW / 5 W)))."""
    body = green(5.0, bench=[SCANNER], viewing={"aid": AID})
    result = found(body)
    said = present.spoken(result, "")
    assert "through the optics entered" in said
    assert "If it stops: " in said
    assert "out to 4960 m" in said
    assert "Unsafe out to 4960 m" in printed(body)
    assert "through the optics entered" in present.spoken(found(green(0.1, viewing={"aid": AID})), "")
    assert chart_of(result).sentences[-1].count("when the sweep stops") >= 1
