"""Summaries from one pass equal the whole answers of the same requests, bit for bit."""

from __future__ import annotations

import math
import random
from collections.abc import Iterator
from typing import Any

import pytest
from pydantic import ValidationError

from service.bulk.flat import flat_record, result_columns
from service.bulk.summary import Summary, summaries, summary_of
from service.contract.answer import answer
from service.contract.request import EvaluationRequest, Line
from tests.web.client import RULES, laser
from tests.web.test_random_requests import requests


def valid(bodies: Iterator[dict[str, Any]]) -> list[EvaluationRequest]:
    found = []
    for body in bodies:
        try:
            found.append(EvaluationRequest.model_validate(body))
        except ValidationError:
            continue
    return found


@pytest.fixture(scope="module")
def sample() -> list[EvaluationRequest]:
    """Random lasers: several lines, elliptical beams, trains, distant waists, every rule set."""
    found = valid(requests(11))
    random.Random(3).shuffle(found)
    return found[:110]


def plain(wavelength_nm: float, power_w: float, **more: Any) -> EvaluationRequest:
    body = laser(wavelength_nm, {"mode": "cw", "power_w": power_w}, **more)
    return EvaluationRequest.model_validate(body)


def test_one_pass_equals_single_answers(sample: list[EvaluationRequest]) -> None:
    together = summaries(sample, range(len(sample)))
    for k, request in enumerate(sample):
        assert together[k] == summary_of(answer(request), request.label, k), request


def test_the_company_does_not_matter(sample: list[EvaluationRequest]) -> None:
    """A laser's figures are the same in any batch: sizes below and above the width of vector units."""
    whole = summaries(sample, range(len(sample)))
    for size in (1, 3, 17):
        for start in range(0, 51, size):
            part = summaries(sample[start : start + size], range(start, start + size))
            assert part == whole[start : start + len(part)]


def test_summaries_have_the_documented_form(sample: list[EvaluationRequest]) -> None:
    for record in summaries(sample[:50], range(50)):
        assert Summary.model_validate(record).model_dump(mode="python") == record


@pytest.mark.parametrize("rules", RULES)
def test_every_code_of_a_notice_is_told(rules: str) -> None:
    """A slip of units, a beam without spread, skin in a blink, an extended source, a large infrared beam."""
    made = [
        plain(532, 1e6, rules=rules),
        plain(532, 0.1, rules=rules, divergence_mrad=0.0),
        plain(532, 5.0, rules=rules, exposure_s=0.25),
        plain(633, 0.1, rules=rules, subtense_mrad=20.0),
        plain(10600, 500.0, rules=rules, diameter_mm=20.0, divergence_mrad=5.0, exposure_s=10.0),
        plain(1240, 1.0, rules=rules, exposure_s=1e-13),
    ]
    together = summaries(made, range(len(made)))
    for k, (request, found) in enumerate(zip(made, together, strict=True)):
        assert found == summary_of(answer(request), request.label, k)
    assert "unusual-power" in together[0]["notices"]
    assert {"zero-divergence", "unbounded"} <= set(together[1]["notices"])
    assert "skin-longer-exposure" in together[2]["notices"]
    assert "extended-source" in together[3]["notices"]
    assert "large-skin-area" in together[4]["notices"]


def changed(base: EvaluationRequest, **more: Any) -> EvaluationRequest:
    return EvaluationRequest.model_validate({**base.model_dump(exclude_unset=True), **more})


@pytest.mark.parametrize("power_w", [1e-3, 5.0])
def test_what_stands_in_the_beam_is_not_left_out(power_w: float) -> None:
    """Benches, aids, haze, distances, fibre ends, open resonators and bounds beside direct beams."""
    direct = plain(1064, power_w)
    fibre = laser(1064, {"mode": "cw", "power_w": power_w})
    fibre["lines"][0]["beam"] = {"profile": "fibre_single_mode", "mode_field_diameter_um": 6.0}
    resonator = laser(1064, {"mode": "cw", "power_w": power_w})
    resonator["lines"][0]["output_mirror_reflectance"] = 0.9
    made = [
        direct,
        changed(direct, bench=[{"element": "lens", "focal_mm": 50.0}]),
        EvaluationRequest.model_validate(fibre),
        changed(direct, bench=[{"element": "diffuser", "reflectance": 0.9, "viewing_deg": 0.0}]),
        changed(direct, viewing={"aid": {"objective_mm": 50.0, "magnification": 7.0}}),
        EvaluationRequest.model_validate(resonator),
        changed(direct, viewing={"visibility_km": 1.0}),
        changed(direct, viewing={"distance_m": 2.0}),
        changed(direct, basis="bound"),
        changed(direct, windows=[{"name": "Door", "distance_m": 2.0}]),
        direct,
    ]
    together = summaries(made, range(len(made)))
    for k, (request, found) in enumerate(zip(made, together, strict=True)):
        assert found == summary_of(answer(request), request.label, k), request
    assert together[0] == {**together[-1], "index": 0}
    assert together[7]["eye"]["at_distance"]["distance_m"] == 2.0
    assert "bound-not-measured" in together[8]["notices"]


def test_aided_eyes_and_stopped_sweeps_are_told() -> None:
    """5 W, 532 nm, 1 mrad, 1/e2: 0.25 s allow 0.97966 mW through the aperture (18 t^0.75 J/m2, 7 mm).

    Standing still, through a pupil of 7 mm: width 0.007 sqrt(-2 / ln(1 - 0.97966 mW / 5 W)), 707.2 m away;
    behind 7 x 50 binoculars 0.049 for 0.007: 4950.4 m.
    """
    bench = [{"element": "scanner", "angle_deg": 30.0, "sweeps_hz": 100.0}]
    aid = {"objective_mm": 50.0, "magnification": 7.0}
    request = changed(plain(532, 5.0), bench=bench, viewing={"aid": aid})
    (found,) = summaries([request], [0])
    allowed = 18.0 * 0.25**-0.25 * math.pi / 4 * 7e-3**2
    across = 0.007 * math.sqrt(-2.0 / math.log1p(-allowed / 5.0))
    assert found["stopped"]["eye"]["hazard_distance_m"] == pytest.approx(across / 1e-3, rel=1e-5)
    assert found["stopped"]["eye_aided"]["hazard_distance_m"] == pytest.approx(7 * across / 1e-3, rel=1e-5)
    assert found["eye"]["hazard_distance_m"] < found["stopped"]["eye"]["hazard_distance_m"]
    assert found["eye_aided"]["hazard_distance_m"] < found["stopped"]["eye_aided"]["hazard_distance_m"]
    Summary.model_validate(found)
    flat = flat_record(found)
    assert set(flat) <= set(result_columns())
    assert flat["worst_eye_hazard_distance_m"] == found["stopped"]["eye_aided"]["hazard_distance_m"]
    assert flat["worst_skin_hazard_distance_m"] == found["stopped"]["skin"]["hazard_distance_m"]
    assert flat["worst_optical_density"] == pytest.approx(math.log10(5.0 / allowed), abs=1e-6)
    (bare,) = summaries([plain(532, 5.0)], [0])
    assert (bare["eye_aided"], bare["stopped"]) == (None, None)
    assert flat_record(bare)["worst_eye_hazard_distance_m"] == bare["eye"]["hazard_distance_m"]
    unbounded = {**bare, "eye_aided": {**bare["eye"], "hazard_distance_m": None}}
    assert flat_record(unbounded)["worst_eye_hazard_distance_m"] == math.inf


def test_every_field_of_a_request_is_known_to_the_passes() -> None:
    """A field that is not among these has no way into a pass: `batched` must then answer it alone."""
    alone = {"bench", "viewing"}
    same = {"label", "rules", "basis", "exposure_s", "lines", "eyewear", "windows"}
    assert set(EvaluationRequest.model_fields) == alone | same
    line = {"wavelength_nm", "emission", "output_mirror_reflectance", "beam", "subtense_mrad"}
    assert set(Line.model_fields) == line


def test_the_example_of_the_contract() -> None:
    """532 nm, 0.1 W, 2 mm, 1 mrad, 0.25 s: limit 18 x 0.25^0.75 J/m2 (ICNIRP 2013, Table 5)."""
    (found,) = summaries([plain(532, 0.1, exposure_s=0.25, label="Bench 4")], [7])
    limit = 18.0 * 0.25**0.75
    assert (found["index"], found["label"], found["rules"]) == (7, "Bench 4", "icnirp-2013")
    assert found["classes"] == {"iec-60825-1-2014": "3B", "us-21cfr1040": "IIIb"}
    assert found["eye"]["governing"]["row"] == "eye-vis-5us-10s"
    assert found["eye"]["governing"]["rule"] == "exposure"
    # The whole beam but exp(-(7 / 1.414)^2) passes 7 mm: ratio = P T / (pi / 4 x (7 mm)^2) / limit.
    assert found["eye"]["hazard_ratio"] == pytest.approx(0.025 / 3.848451e-5 / limit, rel=1e-6)
    assert found["skin"]["hazard_zone_m"] is None
