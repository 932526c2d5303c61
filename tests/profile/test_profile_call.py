"""Files in every form, the exposure in their plane, and what is refused."""

from __future__ import annotations

import base64
from typing import Any

import numpy as np
import pytest
from PIL import Image

from tests.profile.images import as_csv, as_file, gaussian, png, spots
from tests.web.client import GOOD, Client, strict_json
from tests.web.markup import parse
from tests.web.pages import CW, HTML, address, page
from tests.web.shape import assert_problem
from tests.web.test_pages import check_page

CALL = "/api/v1/profile"
ROUND = gaussian(2.0, 2.0)
SPOT = [{"element": "diffuser"}]
AID = {"aid": {"objective_mm": 50.0, "magnification": 7.0}}


def ask(client: Client, **body: Any) -> dict[str, Any]:
    answer = client.post(CALL, json={"pixel_um": 10.0, **body})
    assert answer.status_code == 200, answer.text
    return strict_json(answer.text)


@pytest.mark.parametrize(
    "body",
    [
        {"image": png(ROUND)},
        {"image": png(ROUND, "TIFF"), "format": "tiff"},
        {"image": as_csv(ROUND[::4, ::4], ";"), "format": "csv", "pixel_um": 40.0},
        {"image": as_csv(ROUND[::4, ::4], "\t"), "format": "csv", "pixel_um": 40.0},
    ],
    ids=["png", "tiff", "csv", "tabs"],
)
def test_every_format_gives_the_beam(client: Client, body: dict[str, Any]) -> None:
    answer = ask(client, **body)
    assert answer["diameter_mm"] == pytest.approx([2.0, 2.0], rel=2e-3)
    one = answer["fractions"][0]
    assert one["aperture_mm"] == 1.0
    assert one["fraction"] == pytest.approx(1.0 - np.exp(-0.5), rel=2e-3)
    assert one["ratio"] == pytest.approx(1.0, abs=2e-3)


def test_a_gaussian_image_judges_as_the_gaussian_that_was_entered(client: Client) -> None:
    """The beam of contract v1 (2 mm, 1/e2) imaged at its exit: the ratios of the evaluation."""
    answer = ask(client, image=png(ROUND), evaluation=GOOD)
    result = client.evaluate(GOOD)
    for target in ("eye", "skin"):
        assert answer[target]["entered_ratio"] == pytest.approx(result[target]["hazard_ratio"], rel=1e-9)
        assert answer[target]["hazard_ratio"] == pytest.approx(result[target]["hazard_ratio"], rel=2e-3)
        assert len(answer[target]["criteria"]) == len(result[target]["criteria"])


def test_window_and_hazy_air_take_their_share(client: Client) -> None:
    """A window that passes half; at 1 km visibility 100 m of air leave exp(-3.912 / 10) at 532 nm
    (Koschmieder, from memory)."""
    bare = ask(client, image=png(ROUND), evaluation=GOOD)
    half = {**GOOD, "bench": [{"element": "window", "transmittance": 0.5}]}
    hazy = {**GOOD, "viewing": {"visibility_km": 1.0}, "basis": "bound"}
    behind = ask(client, image=png(ROUND), evaluation=half)
    far, clear = (ask(client, image=png(ROUND), evaluation=e, distance_m=100.0) for e in (hazy, GOOD))
    for target in ("eye", "skin"):
        for ratio in ("hazard_ratio", "entered_ratio"):
            assert behind[target][ratio] == pytest.approx(0.5 * bare[target][ratio], rel=1e-12)
            left = np.exp(-0.3912) * clear[target][ratio]
            assert far[target][ratio] == pytest.approx(left, rel=1e-12)
    assert "bound-not-measured" in [n["code"] for n in far["notices"]]


def test_a_hot_spot_is_worse_than_the_gaussian(client: Client) -> None:
    """A narrow spot with most of the power on a faint wide one, at 1100 nm on the skin and in 1 mm."""
    image = spots([(1.5, 1.5)], 0.2) + 0.02 * spots([(1.5, 1.5)], 2.6)
    answer = ask(client, image=png(image), apertures_mm=[0.2])
    one = answer["fractions"][0]
    assert one["ratio"] > 1.5
    assert "worse-than-gaussian" in [n["code"] for n in answer["notices"]]


def test_notices(client: Client) -> None:
    codes = [n["code"] for n in ask(client, image=png(np.minimum(ROUND, 20_000.0)))["notices"]]
    assert "saturated" in codes
    edge = gaussian(6.0, 6.0)
    assert "beam-at-the-edge" in [n["code"] for n in ask(client, image=png(edge))["notices"]]
    small = gaussian(0.06, 0.06)
    assert "few-pixels" in [n["code"] for n in ask(client, image=png(small))["notices"]]


COLOUR = Image.new("RGB", (20, 20), (200, 10, 10))


def _colour() -> str:
    import io

    buffer = io.BytesIO()
    COLOUR.save(buffer, "PNG")
    return base64.b64encode(buffer.getvalue()).decode()


@pytest.mark.parametrize(
    ("body", "field"),
    [
        ({"image": "###"}, "image"),
        ({"image": base64.b64encode(b"no image at all").decode()}, "image"),
        ({"image": png(ROUND), "format": "tiff"}, "image"),
        ({"image": png(ROUND)[:400]}, "image"),
        ({"image": _colour()}, "image"),
        ({"image": "1,2\n3", "format": "csv"}, "image"),
        ({"image": "1,2\n3,x", "format": "csv"}, "image"),
        ({"image": "1,2\n3,nan", "format": "csv"}, "image"),
        ({"image": "", "format": "csv"}, "image"),
        ({"image": as_csv(np.zeros((10, 10))), "format": "csv"}, "image"),
        ({"image": png(ROUND), "pixel_um": 0}, "pixel_um"),
        ({"image": png(ROUND), "apertures_mm": [0.0]}, "apertures_mm"),
        ({"image": png(ROUND), "evaluation": GOOD, "line": 3}, "line"),
        ({"image": png(ROUND), "evaluation": {**GOOD, "rules": "none"}}, "rules"),
        ({"image": png(ROUND), "evaluation": {**GOOD, "bench": SPOT}}, "evaluation.bench.0.element"),
        ({"image": png(ROUND), "evaluation": {**GOOD, "viewing": AID}}, "evaluation.viewing.aid"),
        ({"image": png(ROUND), "colour": 1}, "colour"),
        ({}, "image"),
    ],
)
def test_refusals_name_the_field(client: Client, body: dict[str, Any], field: str) -> None:
    assert_problem(client.post(CALL, json={"pixel_um": 10.0, **body}), 422, field)


def test_page_takes_a_file(client: Client) -> None:
    check_page(page(client, "/profile"))
    laser = address(CW).partition("?")[2]
    check_page(page(client, f"/profile?{laser}"))
    files = {"image": ("beam.tif", as_file(ROUND, "TIFF"), "image/tiff")}
    sent = {"v": "1", "pixel_um": "10", "laser": laser, "apertures_mm": "1 7"}
    answer = client.post("/profile", data=sent, files=files, headers=HTML)
    assert answer.status_code == 200, answer.text
    root = parse(answer.text)
    check_page(root)
    cells = root.by_id("fractions").one("tbody").all("tr")
    assert float(cells[0].all("data")[0].attributes["value"]) == pytest.approx(1.0 - np.exp(-0.5), rel=2e-3)
    assert "times the limit" in root.one("section", aria_labelledby="verdict-title").text


@pytest.mark.parametrize(
    ("files", "data", "status", "words"),
    [
        ({}, {"v": "1", "pixel_um": "10"}, 422, "no such file"),
        ({"image": ("a.gif", b"GIF89a", "image/gif")}, {"v": "1", "pixel_um": "10"}, 422, "no such file"),
        ({"image": ("a.png", b"PNG", "image/png")}, {"v": "1", "pixel_um": "10"}, 422, "no PNG image"),
        ({"image": ("a.png", as_file(ROUND, "PNG"), "image/png")}, {"v": "1"}, 422, "a value is needed"),
        ({"image": ("a.png", b"PNG", "image/png")}, {"v": "1", "apertures_mm": "1 x"}, 422, "not a number"),
        ({"image": ("a.png", b"PNG", "image/png")}, {"v": "1", "colour": "red"}, 400, "unknown parameter"),
        ({"image": ("a.png", b"PNG", "image/png")}, {"v": "1", "laser": "v=0"}, 400, "another version"),
    ],
)
def test_page_refuses_in_words(client: Client, files: Any, data: Any, status: int, words: str) -> None:
    answer = client.post("/profile", data=data, files=files, headers=HTML)
    assert answer.status_code == status, answer.text
    assert words in answer.text
    check_page(parse(answer.text))


def test_too_large_a_form_is_refused_before_it_is_read(client: Client) -> None:
    headers = {"content-length": "99000000", "content-type": "multipart/form-data; boundary=x"}
    assert client.post("/profile", content=b"--x--", headers=headers).status_code == 413
