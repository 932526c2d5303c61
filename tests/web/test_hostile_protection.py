"""Hostile pairs and windows are refused by name and with a reason, and leave the service as it was."""

from __future__ import annotations

import json
from typing import Any

import pytest

from tests.web.client import COMPARE, EVALUATE, JSON, Client, changed, strict_json
from tests.web.hostile_protection import PAIRS, START, UNREADABLE, WINDOWS, Wrong, sent, unreadable
from tests.web.shape import assert_problem


@pytest.fixture(scope="module")
def good(client: Client) -> dict[str, bytes]:
    answers = {url: client.post(url, json=START) for url in (EVALUATE, COMPARE)}
    assert all(a.status_code == 200 for a in answers.values())
    return {url: a.content for url, a in answers.items()}


def test_there_are_at_least_thirty_of_each() -> None:
    names = [str(w) for w in (*PAIRS, *WINDOWS)]
    assert len(set(names)) == len(names)
    assert len(PAIRS) >= 30
    assert len(WINDOWS) >= 20


@pytest.mark.parametrize("url", [EVALUATE, COMPARE])
@pytest.mark.parametrize("wrong", [*PAIRS, *WINDOWS], ids=str)
def test_refused_by_name(client: Client, good: dict[str, bytes], wrong: Wrong, url: str) -> None:
    assert_problem(client.post(url, content=sent(wrong), headers=JSON), 422, wrong.field)
    assert client.post(url, json=START).content == good[url]


@pytest.mark.parametrize("wrong", [*PAIRS, *WINDOWS], ids=str)
def test_the_reason_helps(client: Client, wrong: Wrong) -> None:
    """What was wrong, and what the field may hold, in the words of the contract and of the standards."""
    document = assert_problem(client.post(EVALUATE, content=sent(wrong), headers=JSON), 422, wrong.field)
    (error,) = (e for e in document["errors"] if e["field"] == wrong.field)
    assert wrong.message in error["message"]
    assert wrong.allowed in error["allowed"]
    assert "instance of" not in error["message"]


@pytest.mark.parametrize(("path", "text"), UNREADABLE, ids=lambda x: str(x)[:40])
def test_numbers_that_are_none(client: Client, path: str, text: str) -> None:
    response = client.post(EVALUATE, content=unreadable(path, text), headers=JSON)
    assert_problem(response, 422, path)


@pytest.mark.parametrize("path", ["eyewear.0.name", "eyewear.0.ranges.0.marking", "windows.0.name"])
def test_half_a_character_is_refused(client: Client, path: str) -> None:
    response = client.post(EVALUATE, content=unreadable(path, '"\\ud800"'), headers=JSON)
    assert 400 <= response.status_code < 500, response.text
    assert strict_json(response.text)["status"] == response.status_code


def test_a_name_twice_is_told_with_its_place(client: Client) -> None:
    text = json.dumps(START).replace('"optical_density": 6', '"optical_density": 6, "optical_density": 5')
    response = client.post(EVALUATE, content=text, headers=JSON)
    assert_problem(response, 422, "eyewear.0.ranges.0.optical_density")


ODD = ["\x00\x1b[2J", "\U0001f600" * 200, "\u202eright to left", "<script>alert(1)</script>", "x" * 200, " "]


@pytest.mark.parametrize("name", ODD)
def test_odd_names_come_back_as_they_were(client: Client, name: str) -> None:
    body = changed("windows.0.name", name, changed("eyewear.0.name", name, START))
    found = client.evaluate(body)["protection"]
    assert found["eyewear"][0]["name"] == found["windows"][0]["name"] == name


EXTREME: dict[str, Any] = {
    "no density": changed("eyewear.0.ranges.0.optical_density", 0, START),
    "the greatest density": changed("eyewear.0.ranges.0.optical_density", 20, START),
    "barely any light": changed("eyewear.0.luminous_transmittance", 5e-324, START),
    "a range of one wavelength": changed("eyewear.0.ranges.0.to_nm", 500, START),
    "the farthest window": changed("windows.0.distance_m", 1e9, START),
    "a window at the exit": changed("windows.0.distance_m", 0, START),
    "the strongest laser": changed("lines.0.emission.power_w", 1e12, START),
    "the weakest laser": changed("lines.0.emission.power_w", 1e-15, START),
    "the narrowest beam": changed("lines.0.beam.diameter_mm", 1e-4, START),
    "the widest beam": changed("lines.0.beam.diameter_mm", 1e5, START),
    "a beam that opens at once": changed("lines.0.beam.divergence_mrad", 3141, START),
    "the strongest short pulse": changed(
        "lines.0.emission", {"mode": "pulse", "energy_j": 1e9, "pulse_s": 1e-13}, START
    ),
    "the fastest train": changed(
        "lines.0.emission", {"mode": "train", "energy_j": 1e-21, "pulse_s": 1e-13, "rate_hz": 1e13}, START
    ),
    "twenty of each": {
        **START,
        "eyewear": [{**START["eyewear"][0], "ranges": START["eyewear"][0]["ranges"] * 20}] * 20,
        "windows": START["windows"] * 20,
    },
}


@pytest.mark.parametrize("body", EXTREME.values(), ids=EXTREME.keys())
def test_extreme_values_inside_the_limits_are_answered(client: Client, body: dict[str, Any]) -> None:
    """Plain numbers, and none of them negative."""
    found = client.evaluate(body)["protection"]
    for line in found["lines"]:
        place = line["worst_place"]
        assert min(place["hazard_ratio"], place["optical_density"], place["transmittance"]) >= 0
    for pair in found["eyewear"]:
        assert pair["remaining_ratio"] >= 0
    for window in found["windows"]:
        assert window["irradiance_w_m2"] >= 0
        assert window["screen_number"] >= 0
