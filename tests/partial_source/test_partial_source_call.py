"""Parts are judged by the one engine; arrays, images, the page and what is refused."""

from __future__ import annotations

from typing import Any

import pytest

from tests.profile.images import as_file, gaussian, png, spots
from tests.web.client import Client, changed, strict_json
from tests.web.markup import parse
from tests.web.pages import HTML, page
from tests.web.shape import assert_problem
from tests.web.test_pages import check_page

CALL = "/api/v1/partial-source"
LASER: dict[str, Any] = {
    "label": "Row of diodes",
    "exposure_s": 0.01,
    "lines": [
        {
            "wavelength_nm": 850,
            "emission": {"mode": "cw", "power_w": 0.05},
            "beam": {"diameter_mm": 5.0, "divergence_mrad": 200.0},
        }
    ],
}
AID = {"aid": {"objective_mm": 50.0, "magnification": 7.0}}
WINDOW = [{"element": "window", "transmittance": 0.5}]
FAR: list[dict[str, Any]] = [{"x_mm": x, "y_mm": 0.0, "width_mm": 0.1} for x in (0.0, 1.0)]


def ask(client: Client, **body: Any) -> dict[str, Any]:
    answer = client.post(CALL, json={"evaluation": LASER, **body})
    assert answer.status_code == 200, answer.text
    return strict_json(answer.text)


def ratio(client: Client, power: float, alpha: float) -> float:
    """The eye's ratio from a plain evaluation."""
    body = changed("lines.0.emission.power_w", power, LASER)
    body["lines"][0]["subtense_mrad"] = alpha
    return float(client.evaluate(body)["eye"]["hazard_ratio"])


def test_two_discs_far_apart_are_half_a_point_each(client: Client) -> None:
    """0.1 mm at 0.1 m is 1 mrad: a small source with half the power (by hand)."""
    answer = ask(client, emitters=FAR)
    assert answer["worst"]["share"] == pytest.approx(0.5)
    assert answer["worst"]["alpha_mrad"] == 1.5
    assert answer["eye_hazard_ratio"] == pytest.approx(ratio(client, 0.025, 1.5), rel=1e-9)
    assert answer["point_ratio"] == pytest.approx(ratio(client, 0.05, 1.5), rel=1e-9)
    assert answer["whole"]["alpha_mrad"] == pytest.approx(6.25, rel=1e-6)
    assert answer["whole"]["hazard_ratio"] == pytest.approx(ratio(client, 0.05, 6.25), rel=1e-6)
    assert "part-is-worse" in [n["code"] for n in answer["notices"]]
    again = client.evaluate(answer["evaluation"])
    assert again["eye"]["hazard_ratio"] == pytest.approx(answer["eye_hazard_ratio"], rel=1e-9)
    assert again["inputs"]["label"] == "Row of diodes (worst part of the source)"


def test_uniform_disc_lies_between_its_diameter_and_five_per_cent_less(client: Client) -> None:
    answer = ask(client, emitters=[{"x_mm": 3.0, "y_mm": -2.0, "width_mm": 1.0}])
    plain = ratio(client, 0.05, 10.0)
    assert plain <= answer["eye_hazard_ratio"] <= plain * 1.06


def test_image_and_emitters_agree(client: Client) -> None:
    """Two discs of 0.1 mm, 1 mm apart, as an image of 10 um pixels."""
    image = png(spots([(1.0, 1.0), (2.0, 1.0)], 0.1) * 20.0)
    answer = ask(client, image=image, pixel_um=10.0, background=0.0)
    assert answer["eye_hazard_ratio"] == pytest.approx(ratio(client, 0.025, 1.5), rel=1e-3)


def test_other_tissues_take_the_whole_source(client: Client) -> None:
    """At 1540 nm the cornea counts: all of the power, whatever the source looks like."""
    far = changed("lines.0.wavelength_nm", 1540, LASER)
    answer = ask(client, evaluation=far, emitters=FAR)
    assert answer["governing"] == "other tissue"
    assert answer["eye_hazard_ratio"] == pytest.approx(client.evaluate(far)["eye"]["hazard_ratio"], rel=1e-12)
    assert "no-retina" in [n["code"] for n in answer["notices"]]


def test_emitters_weigh_by_their_power(client: Client) -> None:
    answer = ask(client, emitters=[{**FAR[0], "power": 3.0}, FAR[1]])
    assert answer["worst"]["share"] == pytest.approx(0.75)


def test_hazy_air_shortens_the_distance_and_left_out_parts_are_named(client: Client) -> None:
    hazy = {**LASER, "basis": "bound", "viewing": {"visibility_km": 0.05, "distance_m": 1.0}}
    hazy["lines"] = [{**LASER["lines"][0], "beam": {"diameter_mm": 5.0, "divergence_mrad": 1.0}}]
    clear = {k: v for k, v in hazy.items() if k != "viewing"}
    far, whole = (ask(client, evaluation=e, emitters=FAR) for e in (hazy, clear))
    assert 0.0 < far["eye_hazard_distance_m"] < whole["eye_hazard_distance_m"]
    part = client.evaluate(far["evaluation"])
    assert part["eye"]["hazard_distance_m"] == pytest.approx(far["eye_hazard_distance_m"], rel=1e-9)
    codes = [n["code"] for n in far["notices"]]
    assert {"bound-not-measured", "left-to-the-evaluation"} <= set(codes)


def test_a_diffuser_image(client: Client) -> None:
    """A Gaussian spot of 4 mm at 0.1 m: the worst part is narrower and worse than all of it."""
    image = png(gaussian(4.0, 4.0))
    answer = ask(client, image=image, pixel_um=10.0)
    assert 15.0 < answer["worst"]["alpha_mrad"] < 45.0
    assert answer["worst"]["hazard_ratio"] > answer["whole"]["hazard_ratio"]
    assert answer["eye_hazard_ratio"] < answer["point_ratio"]


@pytest.mark.parametrize(
    ("body", "field"),
    [
        ({}, "body"),
        ({"emitters": FAR, "image": "x"}, "body"),
        ({"image": "x"}, "body"),
        ({"image": "x", "pixel_um": 1.0}, "image"),
        ({"image": "0,0\n0,0", "format": "csv", "pixel_um": 1.0}, "image"),
        ({"emitters": [{"x_mm": 0, "y_mm": 0}]}, "emitters.0.width_mm"),
        ({"emitters": [{"x_mm": 0, "y_mm": 0, "width_mm": 1, "shape": "star"}]}, "emitters.0.shape"),
        ({"emitters": FAR, "line": 1}, "line"),
        ({"emitters": FAR, "distance_m": 0}, "distance_m"),
        ({"emitters": FAR, "evaluation": {**LASER, "bench": WINDOW}}, "evaluation.bench"),
        ({"emitters": FAR, "evaluation": {**LASER, "viewing": AID}}, "evaluation.viewing.aid"),
        ({"emitters": FAR, "evaluation": {**LASER, "rules": "none"}}, "rules"),
    ],
)
def test_refusals_name_the_field(client: Client, body: dict[str, Any], field: str) -> None:
    assert_problem(client.post(CALL, json={"evaluation": LASER, **body}), 422, field)


def test_page(client: Client) -> None:
    check_page(page(client, "/partial-source"))
    laser = "v=1&exposure_s=0.01&lines=1&wavelength_nm-1=850&mode-1=cw&power_w-1=0.05"
    laser += "&diameter_mm-1=5&divergence_mrad-1=200"
    check_page(page(client, f"/partial-source?{laser}"))
    typed = {"v": "1", "laser": laser, "emitters": "0 0 0.1 repeat 2 1 0\n"}
    answer = client.post("/partial-source", data=typed, files={"image": ("", b"")}, headers=HTML)
    assert answer.status_code == 200, answer.text
    root = parse(answer.text)
    check_page(root)
    shown = root.by_id("parts").one("tbody").all("tr")[0].all("data")
    assert float(shown[2].attributes["value"]) == pytest.approx(ratio(client, 0.025, 1.5), rel=1e-9)
    files = {"image": ("spots.png", as_file(spots([(1.0, 1.0)], 0.5), "PNG"), "image/png")}
    sent = client.post(
        "/partial-source", data={"v": "1", "laser": laser, "pixel_um": "10"}, files=files, headers=HTML
    )
    assert sent.status_code == 200, sent.text
    bad = {"v": "1", "laser": laser, "emitters": "0 0\n0 0 0.1 x much\n0 0 1"}
    wrong = client.post("/partial-source", data=bad, headers=HTML)
    assert wrong.status_code == 422
    check_page(parse(wrong.text))
    assert "line 1: 2 numbers stand here" in wrong.text
    assert "line 2: this is not a number" in wrong.text
