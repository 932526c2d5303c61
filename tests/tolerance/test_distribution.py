"""Distributions that are known beforehand."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from scipy import stats

from service.contract.tolerance import ToleranceRequest
from service.contract.tolerance_answer import tolerance
from tests.web.client import Client, strict_json
from tests.web.pages import HTML, address, page
from tests.web.shape import assert_problem
from tests.web.test_pages import check_page

CALL = "/api/v1/tolerance"
POWER = "lines.0.emission.power_w"
#: The same laser as a form.
GREEN = {
    "lines": "1",
    "wavelength_nm-1": "532",
    "mode-1": "cw",
    "power_w-1": "0.1",
    "diameter_mm-1": "2",
    "divergence_mrad-1": "1",
}
LASER: dict[str, Any] = {
    "wavelength_nm": 532,
    "emission": {"mode": "cw", "power_w": 0.1},
    "beam": {"diameter_mm": 2.0, "divergence_mrad": 1.0},
}


def judged(tolerances: list[dict[str, Any]], line: dict[str, Any] = LASER, **more: Any) -> Any:
    wanted = {"evaluation": {"lines": [line], "exposure_s": 0.25}, "tolerances": tolerances, **more}
    return tolerance(ToleranceRequest.model_validate(wanted))


def test_ratio_is_linear_in_power_so_its_distribution_is_the_power_s() -> None:
    """Uniform +/- 10 %: 95 % lie within 9.5 %, standard deviation 10 % / sqrt 3 (worked by hand)."""
    result = judged([{"field": POWER, "plus_minus_percent": 10.0}])
    ratio = next(d for d in result.distributions if d.figure == "eye_hazard_ratio")
    nominal = result.nominal.eye_hazard_ratio
    assert ratio.interval_95[0] == pytest.approx(nominal * 0.905, rel=1e-3)
    assert ratio.interval_95[1] == pytest.approx(nominal * 1.095, rel=1e-3)
    assert ratio.standard_deviation == pytest.approx(nominal * 0.1 / np.sqrt(3.0), rel=1e-2)
    assert result.worst_case.eye_hazard_ratio == pytest.approx(nominal * 1.1, rel=1e-12)


def test_normal_power_gives_the_interval_of_the_truncated_normal() -> None:
    result = judged([{"field": POWER, "plus_minus_percent": 10.0, "meaning": "normal"}])
    ratio = next(d for d in result.distributions if d.figure == "eye_hazard_ratio")
    nominal = result.nominal.eye_hazard_ratio
    low, high = stats.truncnorm(-3.0, 3.0, 1.0, 0.05).ppf([0.025, 0.975])
    assert ratio.interval_95 == (
        pytest.approx(nominal * low, rel=2e-3),
        pytest.approx(nominal * high, rel=2e-3),
    )
    assert result.worst_case.eye_hazard_ratio == pytest.approx(nominal * 1.15, rel=1e-12)


def test_the_interval_covers_95_per_cent_over_many_seeds() -> None:
    """Of fresh draws: the share inside each seed's interval has mean 0.95 (uniform power, so known)."""
    inside = []
    for seed in range(20):
        result = judged([{"field": POWER, "plus_minus_percent": 10.0}], draws=2000, seed=seed)
        ratio = next(d for d in result.distributions if d.figure == "eye_hazard_ratio")
        low, high = (v / result.nominal.eye_hazard_ratio for v in ratio.interval_95)
        inside.append((high - low) / 0.2)
    assert np.mean(inside) == pytest.approx(0.95, abs=0.005)


def test_independent_inputs_share_the_variance() -> None:
    """Two powers of equal lines with tolerances 3 to 1: squares 9 to 1 of the variance."""
    lines = [LASER, LASER]
    tolerances = [
        {"field": POWER, "plus_minus_percent": 3.0},
        {"field": "lines.1.emission.power_w", "plus_minus_percent": 1.0},
    ]
    wanted = {"evaluation": {"lines": lines, "exposure_s": 0.25}, "tolerances": tolerances, "draws": 20_000}
    result = tolerance(ToleranceRequest.model_validate(wanted))
    assert [i.field for i in result.influence] == [POWER, "lines.1.emission.power_w"]
    assert result.influence[0].share == pytest.approx(0.9, abs=0.02)


def test_chance_of_a_class_is_the_share_of_powers_below_its_limit() -> None:
    """Class 3R ends at 5 mW for a narrow visible beam: IEC 60825-1, AEL of class 3R (from memory)."""
    narrow = {
        "wavelength_nm": 532,
        "emission": {"mode": "cw", "power_w": 0.0049},
        "beam": {"diameter_mm": 0.5, "divergence_mrad": 0.5},
    }
    result = judged([{"field": POWER, "low": 0.0045, "high": 0.0055}], narrow)
    chance = {c.hazard_class: c.share for c in result.classes if c.scheme == "iec-60825-1-2014"}
    assert chance == {"3R": pytest.approx(0.5, abs=0.01), "3B": pytest.approx(0.5, abs=0.01)}
    assert result.nominal.classes["iec-60825-1-2014"] == "3R"
    assert result.worst_case.classes["iec-60825-1-2014"] == "3B"


def test_call_repeats_itself_and_is_strict_json(client: Client) -> None:
    body = {
        "evaluation": {"lines": [LASER]},
        "tolerances": [{"field": POWER, "plus_minus": 0.01}],
        "draws": 5000,
    }
    first, again = (client.post(CALL, json=body) for _ in range(2))
    assert first.status_code == 200, first.text
    assert first.text == again.text
    answer = strict_json(first.text)
    evaluation = answer["worst_case"]["evaluation"]
    result = client.evaluate(evaluation)
    assert result["eye"]["hazard_distance_m"] == pytest.approx(
        answer["worst_case"]["eye_hazard_distance_m"], rel=1e-9
    )


def test_a_beam_without_spread_in_some_draws(client: Client) -> None:
    still = {**LASER, "beam": {"diameter_mm": 2.0, "divergence_mrad": 0.0}}
    body = {
        "evaluation": {"lines": [still]},
        "tolerances": [{"field": POWER, "plus_minus_percent": 5}],
        "draws": 100,
    }
    answer = strict_json(client.post(CALL, json=body).text)
    assert answer["worst_case"]["eye_hazard_distance_m"] is None
    distance = answer["distributions"][0]
    assert (distance["unbounded"], distance["mean"], distance["histogram"]) == (1.0, None, None)


REFUSED = [
    ([{"field": "lines.0.emission.energy_j", "plus_minus": 1}], "tolerances.0.field"),
    ([{"field": "lines.3.emission.power_w", "plus_minus": 1}], "tolerances.0.field"),
    ([{"field": "exposure_s", "plus_minus": 1}], "tolerances.0.field"),
    ([{"field": "label", "plus_minus": 1}], "tolerances.0.field"),
    ([{"field": POWER, "plus_minus": 1}], "tolerances.0.field"),
    ([{"field": POWER}], "tolerances.0"),
    ([{"field": POWER, "low": 1}], "tolerances.0"),
    ([{"field": POWER, "low": 1, "high": 2}], "tolerances.0.low"),
    ([{"field": POWER, "plus_minus": 0.01}] * 2, "tolerances.1.field"),
    ([], "tolerances"),
    ([{"field": POWER, "plus_minus": 0.01, "sigma": 2}], "tolerances.0.sigma"),
]


@pytest.mark.parametrize(("tolerances", "field"), REFUSED)
def test_refusals_name_the_field(client: Client, tolerances: list[dict[str, Any]], field: str) -> None:
    body = {"evaluation": {"lines": [LASER]}, "tolerances": tolerances}
    assert_problem(client.post(CALL, json=body), 422, field)


def test_beams_that_cannot_be_at_a_corner_are_refused(client: Client) -> None:
    beam = {"diameter_mm": 2.0, "divergence_mrad": 1.0, "waist_m": 1.9, "diameter_at": "exit"}
    body = {
        "evaluation": {"lines": [{**LASER, "beam": beam}]},
        "tolerances": [{"field": "lines.0.beam.waist_m", "plus_minus": 0.2}],
    }
    assert_problem(client.post(CALL, json=body), 422, "tolerances.0.field")


def test_page_from_the_evaluation(client: Client) -> None:
    link = address({**GREEN, "exposure_s": "0.25"})
    answer = page(client, link)
    (way,) = [a.attributes["href"] for a in answer.all("a") if a.attributes["href"].startswith("/tolerance?")]
    blank = page(client, way)
    check_page(blank)
    full = f"{way}&t.{POWER}=10%20%25&t.lines.0.beam.divergence_mrad=0.9%20to%201.2&draws=2000"
    root = page(client, full)
    check_page(root)
    same = judged(
        [
            {"field": POWER, "plus_minus_percent": 10.0},
            {"field": "lines.0.beam.divergence_mrad", "low": 0.9, "high": 1.2},
        ],
        draws=2000,
    )
    row = root.by_id("tolerance-figures").one("tbody").all("tr")[0]
    assert float(row.all("data")[1].attributes["value"]) == same.worst_case.eye_hazard_distance_m
    (worst,) = [a for a in root.all("a", class_="button") if "worst" in a.text]
    assert client.get(worst.attributes["href"], headers=HTML).status_code == 200
    check_page(page(client, "/tolerance"))
    wrong = page(client, f"{way}&t.{POWER}=1%2C064", 422)
    check_page(wrong)
    assert "1.064 or 1064" in wrong.one("section", class_="summary").text
    check_page(page(client, f"{way}&t.{POWER}=200%20%25", 422))
    check_page(page(client, f"{way}&t.{POWER}=5%20%25&draws=many", 422))
    page(client, f"{way}&t.colour=5", 400)


def test_extended_source_in_the_page(client: Client) -> None:
    form = {**GREEN, "subtense_mrad-1": "4", "t.lines.0.subtense_mrad": "1", "draws": "200"}
    root = page(client, address(form).replace("/evaluate", "/tolerance"))
    assert "Source subtense" in root.one("main").text


def test_slow_lasers_take_fewer_draws_and_say_how_many_they_may(client: Client) -> None:
    """Elliptical lines with several waists: fewer draws by default, and a limit in the refusal."""
    uneven = {"diameter_mm": [1.0, 2.0], "divergence_mrad": [1.0, 3.0]}
    lines = [{**LASER, "beam": uneven}, {**LASER, "beam": {**uneven, "waist_m": 0.5}}]
    body = {"evaluation": {"lines": lines}, "tolerances": [{"field": POWER, "plus_minus_percent": 5}]}
    problem = assert_problem(client.post(CALL, json={**body, "draws": 100_000}), 422, "draws")
    assert problem["errors"][0]["allowed"] == "100 to 6250 for this laser"
    answer = strict_json(client.post(CALL, json={**body, "draws": 100}).text)
    assert answer["inputs"]["draws"] == 100
    plain = judged([{"field": POWER, "plus_minus_percent": 5}])
    assert plain.inputs["draws"] == 100_000
