"""The call and the page: figures, refusals, and the way into an evaluation."""

from __future__ import annotations

import copy
from typing import Any

import pytest

from tests.bounds.lasers import BODY
from tests.web.client import Client, changed, strict_json
from tests.web.pages import HTML, page
from tests.web.shape import assert_problem
from tests.web.test_pages import check_page

CALL = "/api/v1/bounds"


def ask(client: Client, body: dict[str, Any]) -> dict[str, Any]:
    answer = client.post(CALL, json=body)
    assert answer.status_code == 200, answer.text
    return strict_json(answer.text)


def figures(answer: dict[str, Any], part: str = "bounds") -> dict[str, float]:
    return {f["symbol"]: f["value"] for f in answer[part]}


def test_continuous_bound_is_the_quantum_defect(client: Client) -> None:
    """20 W x 808 / 1064.1."""
    answer = ask(client, BODY)
    assert figures(answer)["P"] == pytest.approx(20.0 * 808.0 / 1064.1, rel=1e-12)
    # Stored: that times the lifetime of 230 us.
    assert figures(answer)["Q_stored"] == pytest.approx(20.0 * 808.0 / 1064.1 * 230e-6, rel=1e-12)
    # One round trip of 0.25 m: 0.5 m / c.
    assert figures(answer)["t_rt"] == pytest.approx(0.5 / 299792458.0, rel=1e-12)


def test_solutions_lie_within_the_bounds(client: Client) -> None:
    answer = ask(client, BODY)
    bound, found = figures(answer), figures(answer, "computed")
    assert found["P_steady"] <= bound["P"]
    assert found["P_in_steady"] <= bound["P_in"]
    assert found["Q_sim"] <= bound["Q"]
    assert found["P_sim"] <= bound["P_peak"]
    assert found["t_sim"] >= bound["t_p"]


CONTINUOUS: dict[str, Any] = {"mode": "cw", "power_w": 30.0}
ONE_PULSE: dict[str, Any] = {"mode": "pulse", "energy_j": 2.0, "pulse_s": 3e-4}
PULSES = {**ONE_PULSE, "rate_hz": 50.0}


@pytest.mark.parametrize(
    ("key", "pump"),
    [
        ("nd-yag", CONTINUOUS),
        ("nd-yag", ONE_PULSE),
        ("nd-yag", PULSES),
        ("ruby", ONE_PULSE),
        ("er-silica-fibre", CONTINUOUS),
        ("hene", CONTINUOUS),
        ("co2", PULSES),
        ("tm-yag", PULSES),
    ],
)
def test_every_way_to_run_is_an_evaluation(client: Client, key: str, pump: dict[str, Any]) -> None:
    answer = ask(client, {**copy.deepcopy(BODY), "medium": key, "pump": pump})
    assert [s["id"] for s in answer["scenarios"]][:2] == ["running", "first_pulse"]
    for scenario in answer["scenarios"]:
        evaluation = scenario["evaluation"]
        result = client.evaluate(evaluation)
        assert "bound, not measured" in result["inputs"]["label"]
        assert result["inputs"]["basis"] == "bound"
        assert "bound-not-measured" in [n["code"] for n in result["notices"]]
        assert result["eye"]["hazard_distance_m"] == scenario["outcome"]["eye_hazard_distance_m"]
        assert result["eye"]["optical_density"] == scenario["outcome"]["eye_optical_density"]
        wavelengths = [line["wavelength_nm"] for line in evaluation["lines"]]
        pump_nm = next(f["value"] for f in answer["medium"] if f["quantity"] == "pump_wavelength_nm")
        # A discharge is no beam and makes no line.
        assert (pump_nm in wavelengths) == (key not in ("hene", "co2"))


def test_energy_is_conserved_over_a_train(client: Client) -> None:
    """Pulses of the train, energy times rate, come to no more than the pump gives and the open time adds."""
    answer = ask(client, {**BODY, "q_switch": {"rate_hz": 5000.0, "open_s": 0.0}})
    train = figures(answer)["Q_train"]
    assert train * 5000.0 <= figures(answer)["P"]
    assert train <= figures(answer)["Q"]


def test_a_two_level_medium_is_refused_with_the_reason(client: Client) -> None:
    problem = assert_problem(client.post(CALL, json={**BODY, "levels": 2}), 422, "levels")
    assert problem["errors"][0]["field"] == "levels"
    assert "cannot invert" in problem["errors"][0]["message"]


@pytest.mark.parametrize(
    ("path", "value", "field"),
    [
        ("medium", "unobtainium", "medium"),
        ("pump_wavelength_nm", 1200.0, "pump_wavelength_nm"),
        ("lower_ratio", 0.5, "lower_ratio"),
        ("resonator.output_reflectance", 1.0, "resonator.output_reflectance"),
        ("resonator.colour", 1.0, "resonator.colour"),
        ("pump", {"mode": "cw"}, "pump"),
        ("pump", {"mode": "pulse", "energy_j": 1.0, "pulse_s": 1e-3, "rate_hz": 2e3}, "pump"),
        ("rules", "none", "rules"),
        ("medium", None, "levels"),
    ],
)
def test_refusals_name_the_field(client: Client, path: str, value: Any, field: str) -> None:
    assert_problem(client.post(CALL, json=changed(path, value, BODY)), 422, field)


def test_media_are_listed_with_their_sources(client: Client) -> None:
    media = client.get("/api/v1/gain-media").json()
    assert {"nd-yag", "ruby", "co2"} <= {m["key"] for m in media}
    assert all(f["source"] and f["known"] == "memory" for m in media for f in m["figures"])


def test_page_leads_into_the_evaluation(client: Client) -> None:
    root = page(client, "/before-first-light")
    check_page(root)
    examples = [a for a in root.one("main").all("a") if "/before-first-light?" in a.attributes["href"]]
    assert len(examples) == 3
    for example in examples:
        shown = page(client, example.attributes["href"])
        check_page(shown)
        assert "bound, not measured" in shown.one("h1").text
        for link in shown.all("a", class_="button"):
            answer = client.get(link.attributes["href"], headers=HTML)
            assert answer.status_code == 200, "the link must be the one address of the evaluation"
            assert "bound, not measured" in answer.text
            assert "Bound, not measured: the figures entered" in answer.text


def test_page_shows_what_is_wrong(client: Client) -> None:
    root = page(client, "/before-first-light?v=1&medium=nd-yag&levels=2&pump.power_w=1%2C064", 422)
    check_page(root)
    assert "1,064 can mean 1.064 or 1064" in root.one("section", class_="summary").text
    page(client, "/before-first-light?v=1&colour=red", 400)
    page(client, "/before-first-light?medium=nd-yag", 400)
    check_page(page(client, "/gain-media"))
