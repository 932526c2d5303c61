"""Readings behind an aperture and fitted beams become evaluations and tolerances."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from tests.web.client import Client, changed, strict_json
from tests.web.pages import HTML, page
from tests.web.shape import assert_problem
from tests.web.test_pages import check_page

CALL = "/api/v1/measured"
DISTANCES = [-0.1, 0.1, 0.3, 0.5, 0.7, 1.4, 1.6, 1.9, 2.3, 2.8]
BODY: dict[str, Any] = {
    "label": "Bench 4",
    "wavelength_nm": 532,
    "reading": {
        "quantity": "power_w",
        "value": 0.08,
        "aperture_mm": 2.0,
        "distance_m": 1.3,
        "uncertainty_percent": 5,
    },
    "points": [{"distance_m": z, "diameter_mm": float(np.hypot(1.0, 2.0 * (z - 0.3)))} for z in DISTANCES],
    "diameter_uncertainty_percent": 2,
}


def ask(client: Client, body: dict[str, Any]) -> dict[str, Any]:
    answer = client.post(CALL, json=body)
    assert answer.status_code == 200, answer.text
    return strict_json(answer.text)


def test_the_whole_beam_follows_from_its_share(client: Client) -> None:
    """At 1.3 m the beam is sqrt 5 mm wide (1/e2): 1 - exp(-2 (2 / sqrt 5)^2) passes 2 mm (by hand)."""
    answer = ask(client, BODY)
    share = 1.0 - np.exp(-2.0 * 4.0 / 5.0)
    assert answer["fraction"] == pytest.approx(share, rel=1e-9)
    assert answer["total"]["value"] == pytest.approx(0.08 / share, rel=1e-9)
    assert answer["total"]["uncertainty"] == pytest.approx(0.004 / share, rel=1e-9)
    line = answer["evaluation"]["lines"][0]
    assert line["emission"] == {"mode": "cw", "power_w": pytest.approx(0.08 / share)}
    assert line["beam"]["diameter_mm"] == pytest.approx(1.0, rel=1e-9)
    assert line["beam"]["divergence_mrad"] == pytest.approx(2.0, rel=1e-9)
    assert line["beam"]["waist_m"] == pytest.approx(0.3, rel=1e-9)
    result = client.evaluate(answer["evaluation"])
    assert result["eye"]["hazard_distance_m"] == answer["outcome"]["eye_hazard_distance_m"]
    assert result["inputs"]["basis"] == "measured"


def test_irradiance_is_power_over_the_aperture(client: Client) -> None:
    """0.08 W over pi mm2 is 25465 W/m2 (by hand)."""
    reading = {**BODY["reading"], "quantity": "irradiance_w_m2", "value": 0.08 / (np.pi * 1e-6)}
    assert ask(client, {**BODY, "reading": reading})["through"] == pytest.approx(0.08, rel=1e-12)


def test_uncertainties_enter_the_tolerances(client: Client) -> None:
    answer = ask(client, BODY)
    sizes = {t["field"]: t for t in answer["tolerance"]["tolerances"]}
    assert sizes["lines.0.emission.power_w"]["plus_minus_percent"] == 5
    assert sizes["lines.0.beam.diameter_mm"]["plus_minus_percent"] == pytest.approx(2.0, rel=1e-3)
    assert {t["meaning"] for t in sizes.values()} == {"normal"}
    judged = client.post("/api/v1/tolerance", json={**answer["tolerance"], "draws": 500})
    assert judged.status_code == 200, judged.text
    worst = judged.json()["worst_case"]["eye_hazard_distance_m"]
    assert worst > answer["outcome"]["eye_hazard_distance_m"]


def test_astigmatic_beam_takes_the_farther_waist_and_says_so(client: Client) -> None:
    points = [
        {
            "distance_m": z,
            "diameter_mm": [float(np.hypot(1.0, 2.0 * (z - 0.3))), float(np.hypot(2.0, 3.0 * z))],
        }
        for z in DISTANCES
    ]
    answer = ask(client, {**BODY, "points": points})
    beam = answer["evaluation"]["lines"][0]["beam"]
    assert beam["diameter_mm"] == pytest.approx([1.0, 2.0], rel=1e-6)
    assert beam["divergence_mrad"] == pytest.approx([2.0, 3.0], rel=1e-6)
    assert beam["waist_m"] == pytest.approx(0.3, rel=1e-6)
    assert "two-waists" in [n["code"] for n in answer["notices"]]


def test_pulses(client: Client) -> None:
    energy = {**BODY["reading"], "quantity": "energy_j", "value": 1e-6}
    beam = {"diameter_mm": 1.0, "divergence_mrad": 1.0, "profile": "tophat"}
    plain = {k: v for k, v in BODY.items() if k != "points"} | {
        "reading": energy,
        "beam": beam,
        "pulse_s": 1e-8,
    }
    answer = ask(client, plain)
    assert answer["evaluation"]["lines"][0]["emission"]["mode"] == "pulse"
    assert answer["fits"] == []
    train = ask(client, {**plain, "rate_hz": 100.0, "reading": BODY["reading"]})
    assert train["evaluation"]["lines"][0]["emission"]["average_power_w"] == train["total"]["value"]


def test_a_fibre_end_read_through_an_aperture(client: Client) -> None:
    """Half angle NA / 1.7 (1/e): at 50 mm the beam is hypot(0.105, 2 x 0.22 / 1.7 x 50) mm wide (by hand)."""
    fibre = {"profile": "fibre_multimode", "numerical_aperture": 0.22, "core_diameter_um": 105.0}
    reading = {**BODY["reading"], "aperture_mm": 7.0, "distance_m": 0.05}
    answer = ask(client, {"wavelength_nm": 808, "reading": reading, "beam": fibre})
    across = np.hypot(0.105, 2.0 * 0.22 / 1.7 * 50.0)
    assert answer["fraction"] == pytest.approx(1.0 - np.exp(-((7.0 / across) ** 2)), rel=1e-9)
    assert answer["evaluation"]["lines"][0]["beam"] == fibre
    assert [t["field"] for t in answer["tolerance"]["tolerances"]] == ["lines.0.emission.power_w"]
    judged = client.post("/api/v1/tolerance", json={**answer["tolerance"], "draws": 500})
    assert judged.status_code == 200, judged.text
    wrong = {"wavelength_nm": 808, "reading": reading, "beam": {**fibre, "numerical_aperture": 2}}
    problem = assert_problem(client.post(CALL, json=wrong), 422, "beam.numerical_aperture")
    assert problem["errors"][0]["allowed"] == "a number, 0.01 to 1"


@pytest.mark.parametrize(
    ("path", "value", "field"),
    [
        ("points", [], "body"),
        ("points", BODY["points"][:2], "points"),
        ("points.0.diameter_mm", -1.0, "points.0.diameter_mm"),
        ("points.0.uncertainty_mm", 0.1, "body"),
        ("rate_hz", 10.0, "body"),
        ("pulse_s", 1e-8, "body"),
        ("reading.quantity", "luminance", "reading.quantity"),
        ("reading.value", 0, "reading.value"),
        ("reading.value", 1e14, "reading"),
        ("rules", "none", "rules"),
    ],
)
def test_refusals_name_the_field(client: Client, path: str, value: Any, field: str) -> None:
    assert_problem(client.post(CALL, json=changed(path, value, BODY)), 422, field)


def test_notices_for_poor_measurements(client: Client) -> None:
    few = ask(client, {**BODY, "points": BODY["points"][:6]})
    assert "few-points" in [n["code"] for n in few["notices"]]
    near = [
        {"distance_m": z, "diameter_mm": float(np.hypot(1.0, 2.0 * z))} for z in (0.0, 0.1, 0.2, 0.3, 0.4)
    ]
    assert "places-one-sided" in [n["code"] for n in ask(client, {**BODY, "points": near})["notices"]]
    thin = [{**p, "diameter_mm": p["diameter_mm"] * 0.1} for p in BODY["points"]]
    assert "below-diffraction-limit" in [n["code"] for n in ask(client, {**BODY, "points": thin})["notices"]]
    reading = {**BODY["reading"], "aperture_mm": 0.1}
    assert "small-share" in [n["code"] for n in ask(client, {**BODY, "reading": reading})["notices"]]


def test_page_leads_on(client: Client) -> None:
    blank = page(client, "/measured")
    check_page(blank)
    examples = [a for a in blank.one("main").all("a") if "/measured?" in a.attributes["href"]]
    assert len(examples) == 2
    for example in examples:
        root = page(client, example.attributes["href"])
        check_page(root)
        evaluate, judge = root.all("a", class_="button")
        assert client.get(evaluate.attributes["href"], headers=HTML).status_code == 200
        assert "tolerance-figures" in page(client, judge.attributes["href"] + "&draws=500").ids
    wrong = page(client, "/measured?v=1&wavelength_nm=532&points=1%202%203%204%0A1%20x", 422)
    check_page(wrong)
    summary = wrong.one("section", class_="summary").text
    assert "line 1 holds 4 numbers" in summary
    assert "line 2: this is not a number" in summary
