"""Fibre ends, open resonators, benches and hazy air with tolerances, and what is refused of them."""

from __future__ import annotations

from typing import Any

import pytest

from tests.tolerance.test_spread import CW, PULSE, TRAIN, compare
from tests.tolerance.test_worst_case import no_draw_is_worse
from tests.web.client import Client, strict_json
from tests.web.pages import address, page
from tests.web.shape import assert_problem
from tests.web.test_pages import check_page

CALL = "/api/v1/tolerance"
POWER = "lines.0.emission.power_w"
SINGLE = {"profile": "fibre_single_mode", "mode_field_diameter_um": 6.0}
MANY = {"profile": "fibre_multimode", "numerical_aperture": 0.22, "core_diameter_um": 105.0}
#: A focus behind the last element, and a mirror that leaves the axes with waists of their own.
BENCH: list[dict[str, Any]] = [
    {"element": "window", "transmittance": 0.4},
    {"element": "space", "length_m": 0.3},
    {"element": "lens", "focal_mm": 200.0, "transmittance": 0.9},
    {"element": "reflector", "material": "crown glass", "incidence_deg": 45.0},
]
TILTED: list[dict[str, Any]] = [{"element": "mirror", "radius_mm": 500.0, "incidence_deg": 30.0}]
HAZE = {"visibility_km": 2.0}

CASES: dict[str, tuple[dict[str, Any], list[str]]] = {
    "single-mode fibre": (
        {"lines": [{**CW, "beam": SINGLE}]},
        ["beam.mode_field_diameter_um", "wavelength_nm", "emission.power_w"],
    ),
    "multimode fibre": (
        {"lines": [{**TRAIN, "beam": MANY}], "exposure_s": 3.0},
        ["beam.core_diameter_um", "beam.numerical_aperture", "emission.average_power_w"],
    ),
    "open resonator": (
        {"lines": [{**CW, "output_mirror_reflectance": 0.98}]},
        ["emission.power_w", "beam.divergence_mrad"],
    ),
    "bench": ({"lines": [CW], "bench": BENCH}, ["emission.power_w", "subtense_mrad"]),
    "bench and fibre": (
        {"lines": [{**PULSE, "beam": MANY}], "bench": BENCH[:3]},
        ["emission.energy_j", "emission.pulse_s"],
    ),
    "astigmatic": (
        {"lines": [{**PULSE, "beam": CW["beam"]}], "bench": TILTED},
        ["emission.energy_j", "emission.pulse_s"],
    ),
    "train behind a bench": (
        {"lines": [{**TRAIN, "beam": CW["beam"]}], "bench": BENCH, "exposure_s": 1.0},
        ["emission.average_power_w", "emission.rate_hz", "emission.pulse_s", "exposure_s"],
    ),
    "haze": (
        {"lines": [CW], "viewing": HAZE},
        ["emission.power_w", "beam.diameter_mm", "beam.divergence_mrad"],
    ),
    "haze and a waist": (
        {"lines": [{**CW, "beam": {**CW["beam"], "waist_m": 3.0}}], "viewing": HAZE},
        ["emission.power_w", "beam.waist_m"],
    ),
    "haze behind a bench": ({"lines": [CW], "viewing": HAZE, "bench": BENCH}, ["emission.power_w"]),
}


def fields_of(names: list[str]) -> list[str]:
    return [n if n == "exposure_s" else f"lines.0.{n}" for n in names]


@pytest.mark.parametrize("name", CASES)
def test_each_draw_is_a_single_evaluation(name: str) -> None:
    body, names = CASES[name]
    compare(body, fields_of(names), draws=5)


@pytest.mark.parametrize("name", CASES)
def test_no_draw_is_worse_than_the_worst_case(name: str) -> None:
    body, names = CASES[name]
    tolerances = [{"field": f, "plus_minus_percent": 8.0} for f in fields_of(names)]
    no_draw_is_worse({"evaluation": body, "tolerances": tolerances, "draws": 100}, 100)


def test_a_bench_takes_its_share(client: Client) -> None:
    """Half of 0.1 W behind a window that passes half; ratios are linear in power (by hand)."""
    plain = {"lines": [CW]}
    half = {**plain, "bench": [{"element": "window", "transmittance": 0.5}]}
    wanted = {"tolerances": [{"field": POWER, "plus_minus_percent": 10}], "draws": 100}
    whole, less = (
        strict_json(client.post(CALL, json={"evaluation": e, **wanted}).text) for e in (plain, half)
    )
    for figures in ("nominal", "worst_case"):
        assert less[figures]["eye_hazard_ratio"] == pytest.approx(
            0.5 * whole[figures]["eye_hazard_ratio"], rel=1e-12
        )
        # The class is that of what leaves the laser.
        assert less[figures]["classes"] == whole[figures]["classes"]
    evaluated = client.evaluate(less["worst_case"]["evaluation"])
    assert evaluated["eye"]["hazard_ratio"] == pytest.approx(
        less["worst_case"]["eye_hazard_ratio"], rel=1e-12
    )


AID = {"aid": {"objective_mm": 50.0, "magnification": 7.0}}
DIFFUSER = [{"element": "diffuser"}]
SCANNER = [{"element": "scanner", "angle_deg": 20.0, "sweeps_hz": 100.0}]
REFUSED = [
    ({"bench": DIFFUSER}, "emission.power_w", "evaluation.bench.0.element"),
    ({"bench": [*BENCH, *SCANNER]}, "emission.power_w", "evaluation.bench.4.element"),
    ({"viewing": AID}, "emission.power_w", "evaluation.viewing.aid"),
    ({"bench": BENCH}, "wavelength_nm", "tolerances.0.field"),
    ({"bench": BENCH}, "beam.diameter_mm", "tolerances.0.field"),
    ({"bench": BENCH}, "beam.divergence_mrad", "tolerances.0.field"),
    ({"bench": BENCH}, "beam.waist_m", "tolerances.0.field"),
    ({"viewing": HAZE}, "wavelength_nm", "tolerances.0.field"),
    ({}, "output_mirror_reflectance", "tolerances.0.field"),
    ({}, "beam.core_diameter_um", "tolerances.0.field"),
    ({"bench": [{"element": "prism"}]}, "emission.power_w", "evaluation.bench.0.element"),
]


@pytest.mark.parametrize(("more", "name", "field"), REFUSED)
def test_what_cannot_be_judged_is_refused(
    client: Client, more: dict[str, Any], name: str, field: str
) -> None:
    body = {
        "evaluation": {"lines": [CW], **more},
        "tolerances": [{"field": f"lines.0.{name}", "plus_minus": 0.0}],
    }
    assert_problem(client.post(CALL, json=body), 422, field)


def test_fibre_ends_behind_a_bench_and_past_their_range_are_refused(client: Client) -> None:
    field = "lines.0.beam.numerical_aperture"
    evaluation: dict[str, Any] = {"lines": [{**CW, "beam": MANY}]}
    body = {"evaluation": evaluation, "tolerances": [{"field": field, "low": 0.2, "high": 1.2}]}
    assert_problem(client.post(CALL, json=body), 422, "tolerances.0.field")
    body = {
        "evaluation": {**evaluation, "bench": BENCH},
        "tolerances": [{"field": field, "low": 0.2, "high": 0.3}],
    }
    assert_problem(client.post(CALL, json=body), 422, "tolerances.0.field")


def test_what_the_evaluation_says_of_itself_is_told(client: Client) -> None:
    evaluation = {
        "lines": [CW],
        "basis": "bound",
        "viewing": {"distance_m": 2.0},
        "windows": [{"name": "Door", "distance_m": 2.0}],
    }
    body = {
        "evaluation": evaluation,
        "tolerances": [{"field": POWER, "plus_minus_percent": 5}],
        "draws": 100,
    }
    notices = {n["code"]: n for n in strict_json(client.post(CALL, json=body).text)["notices"]}
    assert notices["bound-not-measured"]["field"] == "evaluation.basis"
    assert notices["left-to-the-evaluation"]["text"].endswith("the viewing distance, windows.")


FIBRE = {
    "lines": "1",
    "wavelength_nm-1": "808",
    "mode-1": "cw",
    "power_w-1": "1",
    "profile-1": "fibre_multimode",
    "numerical_aperture-1": "0.22",
    "core_diameter_um-1": "105",
}


def test_pages_of_fibre_ends_and_benches(client: Client) -> None:
    link = address({**FIBRE, "t.lines.0.beam.numerical_aperture": "5 %", "draws": "200"})
    root = page(client, link.replace("/evaluate", "/tolerance"))
    check_page(root)
    assert "tolerance-figures" in root.ids
    behind = {**FIBRE, "elements": "1", "bench_kind-1": "lens", "bench_focal_mm-1": "10"}
    root = page(
        client, address({**behind, f"t.{POWER}": "5 %", "draws": "200"}).replace("/evaluate", "/tolerance")
    )
    check_page(root)
    spot = {**FIBRE, "elements": "1", "bench_kind-1": "diffuser"}
    root = page(client, address({**spot, f"t.{POWER}": "5 %"}).replace("/evaluate", "/tolerance"), 422)
    check_page(root)
    summary = root.one("section", class_="summary").text
    assert "Element 1: behind a diffuser" in summary
    assert "highest power or energy" in summary
    wrong = address({**FIBRE, "power_w-1": "much", f"t.{POWER}": "5 %"}).replace("/evaluate", "/tolerance")
    assert "Power (line 1)" in page(client, wrong, 422).one("section", class_="summary").text
