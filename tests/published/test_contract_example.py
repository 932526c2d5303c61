"""The example of contract v1, every intermediate by hand.

532 nm, 0.1 W continuous, 2.0 mm and 1.0 mrad at 1/e2, 0.25 s, `icnirp-2013`. The limits 18 t^0.75 J/m2 (eye)
and 1.1e4 t^0.25 J/m2 (skin) and the apertures are ICNIRP 2013, from memory; the rest is arithmetic:

    eye limit       18 x 0.25^0.75 = 18 x 0.353553     = 6.36396 J/m2     / 0.25 s = 25.4558 W/m2
    pupil area      pi/4 x (7 mm)^2                    = 38.4845 mm2
    diameter at 1/e 2.0 / 1.414214                     = 1.414214 mm
    divergence      1.0 / 1.414214                     = 0.707107 mrad
    share           1 - exp(-(7 / 1.414214)^2) = 1 - exp(-24.5) = 1 - 2.29e-11
    exposure        0.1 W x 0.25 s / 38.4845 mm2       = 649.612 J/m2
    ratio           649.612 / 6.36396                  = 102.077
    density         log10(102.077)                     = 2.00893
    share at limit  1 / 102.077                        = 0.00979656
    diameter wanted 7 mm / sqrt(-ln(1 - 0.00979656)) = 7 mm / sqrt(0.00984487) = 70.549 mm
    distance        sqrt(70.549^2 - 1.414^2) mm / 0.707107 mrad = 70.535 / 0.707107 = 99.752 m

    skin limit      1.1e4 x 0.25^0.25 = 1.1e4 x 0.707107 = 7778.17 J/m2   / 0.25 s = 31112.7 W/m2
    skin aperture   pi/4 x (3.5 mm)^2                  = 9.62113 mm2
    share           1 - exp(-(3.5 / 1.414214)^2) = 1 - exp(-6.125) = 0.997813
    exposure        0.025 J x 0.997813 / 9.62113 mm2   = 2592.76 J/m2
    ratio           2592.76 / 7778.17                  = 0.33334
"""

from __future__ import annotations

import pytest

from service.contract.answer import answer
from service.contract.evaluation import EvaluationResult
from service.contract.request import EvaluationRequest
from tests.web.client import GOOD


@pytest.fixture(scope="module")
def result() -> EvaluationResult:
    return answer(EvaluationRequest.model_validate(GOOD))


def test_eye_criterion(result: EvaluationResult) -> None:
    (row,) = result.eye.criteria
    assert (row.line, row.rule, row.tissue, row.effect) == (0, "exposure", "retina", "thermal")
    assert row.row == "eye-vis-5us-10s"
    assert row.limit_j_m2 == pytest.approx(6.36396, abs=5e-6)
    assert row.limit_w_m2 == pytest.approx(25.4558, abs=5e-5)
    assert row.aperture_mm == 7.0
    assert row.duration_s == 0.25
    assert row.exposure_j_m2 == pytest.approx(649.612, abs=5e-4)
    assert row.hazard_ratio == pytest.approx(102.077, abs=5e-4)
    assert row.hazard_distance_m == pytest.approx(99.752, abs=5e-4)


def test_eye_answer_as_the_contract_prints_it(result: EvaluationResult) -> None:
    """Figures of the contract: 99.8 m, 102.1, 2.01, 6.36 J/m2, 25.5 W/m2; half a unit in the last digit."""
    eye = result.eye
    assert eye.governing == 0
    assert eye.hazard_distance_m == pytest.approx(99.8, abs=0.05)
    assert eye.hazard_zone_m == (0.0, eye.hazard_distance_m)
    assert eye.hazard_ratio == pytest.approx(102.1, abs=0.05)
    assert eye.optical_density == pytest.approx(2.01, abs=0.005)
    assert eye.criteria[0].limit_j_m2 == pytest.approx(6.36, abs=0.005)
    assert eye.criteria[0].limit_w_m2 == pytest.approx(25.5, abs=0.05)


#: Symbols of the working for the eye, in order where one is named twice, with values by hand.
WORKING = [
    ("T", None, 0.25, 0.0),
    ("C_E", "eye", 1.0, 0.0),
    ("H_MPE", "eye", 6.36396, 5e-6),
    ("a", "eye", 7.0, 1e-12),
    ("H", "eye", 649.612, 5e-4),
    ("H / H_MPE", "eye", 102.077, 5e-4),
    ("OD", "eye", 2.00893, 5e-6),
    ("d(z)", "eye", 70.549, 5e-4),
    ("z", "eye", 99.752, 5e-4),
    ("H_MPE", "skin", 7778.17, 5e-3),
    ("a", "skin", 3.5, 1e-12),
    ("H", "skin", 2592.76, 5e-3),
    ("H / H_MPE", "skin", 0.33334, 5e-6),
    ("OD", "skin", 0.0, 0.0),
    ("z", "skin", 0.0, 0.0),
]


@pytest.mark.parametrize(
    ("symbol", "target", "value", "tolerance"), WORKING, ids=[f"{w[0]} {w[1]}" for w in WORKING]
)
def test_working(
    result: EvaluationResult, symbol: str, target: str | None, value: float, tolerance: float
) -> None:
    (step,) = (s for s in result.working if s.symbol == symbol and s.target == target)
    assert step.value == pytest.approx(value, abs=tolerance)


def test_skin(result: EvaluationResult) -> None:
    """Below its limit everywhere: no distance, no density."""
    (row,) = result.skin.criteria
    assert (row.rule, row.tissue, row.effect) == ("exposure", "skin", "thermal")
    assert row.limit_j_m2 == pytest.approx(7778.17, abs=5e-3)
    assert row.limit_w_m2 == pytest.approx(31112.7, abs=0.05)
    assert row.aperture_mm == 3.5
    assert row.exposure_j_m2 == pytest.approx(2592.76, abs=5e-3)
    assert result.skin.hazard_ratio == pytest.approx(0.33334, abs=5e-6)
    assert result.skin.hazard_distance_m == 0.0
    assert result.skin.hazard_zone_m is None
    assert result.skin.optical_density == 0.0
