"""Hostile requests are refused by name, and leave the service as it was."""

from __future__ import annotations

import json
import time
from typing import Any

import pytest

from tests.web.client import COMPARE, EVALUATE, GOOD, JSON, Client, changed, laser, strict_json
from tests.web.hostile import HOSTILE, LIMIT, SURROGATES, Hostile
from tests.web.shape import assert_problem


def send(client: Client, url: str, hostile: Hostile) -> Any:
    body = hostile.body if isinstance(hostile.body, bytes) else hostile.body()
    return client.post(url, content=body, headers=hostile.headers)


@pytest.fixture(scope="module")
def good(client: Client) -> dict[str, bytes]:
    """The answers to the good request before anything hostile was sent."""
    return {url: client.post(url, json=GOOD).content for url in (EVALUATE, COMPARE)}


def test_there_are_at_least_fifty() -> None:
    assert len({h.name for h in HOSTILE}) == len(HOSTILE) >= 50


@pytest.mark.parametrize("url", [EVALUATE, COMPARE])
@pytest.mark.parametrize("hostile", HOSTILE, ids=lambda h: h.name)
def test_refused_by_name(client: Client, good: dict[str, bytes], hostile: Hostile, url: str) -> None:
    assert_problem(send(client, url, hostile), hostile.status, hostile.field)
    after = client.post(url, json=GOOD)
    assert after.status_code == 200
    assert after.content == good[url]


@pytest.mark.parametrize("hostile", SURROGATES, ids=lambda h: h.name)
def test_half_a_character_is_refused(client: Client, hostile: Hostile) -> None:
    """RFC 8259 8.2: a lone surrogate is allowed by the grammar and unpredictable in use."""
    response = send(client, EVALUATE, hostile)
    assert 400 <= response.status_code < 500, response.text
    assert strict_json(response.text)["status"] == response.status_code


LABELS = ["\x00\x1b[2J", "\U0001f600" * 200, "\u202eright to left", "<script>alert(1)</script>", "x" * 200]


@pytest.mark.parametrize("label", LABELS)
def test_odd_labels_come_back_as_they_were(client: Client, label: str) -> None:
    assert client.evaluate(changed("label", label))["inputs"]["label"] == label


def test_a_body_at_the_limit_is_read(client: Client) -> None:
    text = json.dumps(GOOD)
    padded = text + " " * (LIMIT - len(text))
    assert client.post(EVALUATE, content=padded, headers=JSON).status_code == 200


MEDIA = ["application/json; charset=utf-8", "APPLICATION/JSON", "application/vnd.example+json"]


@pytest.mark.parametrize("media", MEDIA)
def test_names_of_json_are_understood(client: Client, media: str) -> None:
    response = client.post(EVALUATE, content=json.dumps(GOOD), headers={"content-type": media})
    assert response.status_code == 200


def test_every_wrong_field_is_named_at_once(client: Client) -> None:
    body = changed("lines.0.wavelength_nm", "green")
    body["lines"].append({"wavelength_nm": 1, "emission": {"mode": "cw"}, "beam": {"diameter_mm": 1}})
    document = assert_problem(client.post(EVALUATE, json=body), 422, "lines.0.wavelength_nm")
    fields = [e["field"] for e in document["errors"]]
    assert fields == [
        "lines.0.wavelength_nm",
        "lines.1.wavelength_nm",
        "lines.1.emission.power_w",
        "lines.1.beam.divergence_mrad",
    ]


def test_a_name_twice_is_told_with_its_place(client: Client) -> None:
    """Errors carry the path of a field; with 16 lines its last part alone does not say which."""
    text = json.dumps(GOOD).replace('"wavelength_nm": 532', '"wavelength_nm": 532, "wavelength_nm": 1064')
    assert_problem(client.post(EVALUATE, content=text, headers=JSON), 422, "lines.0.wavelength_nm")


WHOLE = {"array": [], "number": 1, "line as text": changed("lines", ["x"]), "viewing": changed("viewing", [])}


@pytest.mark.parametrize("body", WHOLE.values(), ids=WHOLE.keys())
def test_messages_speak_of_json_and_not_of_classes(client: Client, body: Any) -> None:
    document = assert_problem(client.post(EVALUATE, json=body), 422, None if body is None else _field(body))
    for error in document["errors"]:
        assert "instance of" not in error["message"]
        assert "dictionary" not in error["message"]
        assert error["allowed"] != "no such field"


def _field(body: Any) -> str:
    if not isinstance(body, dict):
        return "body"
    return "lines.0" if body["lines"] == ["x"] else "viewing"


#: Inside every allowed range, and yet beyond what doubles carry when multiplied or squared.
ABSURD = {
    "energy from average power and rate overflows": changed(
        "lines.0.emission", {"mode": "train", "pulse_s": 1e-8, "average_power_w": 1e12, "rate_hz": 1e-300}
    ),
    "power underflows": changed("lines.0.emission.power_w", 5e-324),
    "diameter squared underflows": changed("lines.0.beam.diameter_mm", 1e-200),
    "one axis underflows": changed("lines.0.beam.diameter_mm", [1e-200, 1]),
    "distance overflows": changed("lines.0.beam.divergence_mrad", 1e-320),
    "a top hat as narrow": laser(
        *(10600, {"mode": "cw", "power_w": 10.0}),
        profile="tophat",
        diameter_mm=1e-160,
        divergence_mrad=[300, 0],
        waist_m=5,
        viewing={"distance_m": 2000},
    ),
    "one axis as narrow": laser(
        *(315, {"mode": "cw", "power_w": 1e-6}),
        profile="tophat",
        diameter_mm=[1e-160, 4000],
        divergence_mrad=0,
        waist_m=1e6,
    ),
    "one axis spreads, barely": changed("lines.0.beam.divergence_mrad", [1, 1e-320]),
}


@pytest.mark.parametrize("body", ABSURD.values(), ids=ABSURD.keys())
def test_absurd_values_are_answered_or_refused(client: Client, body: dict[str, Any]) -> None:
    response = client.post(EVALUATE, json=body)
    assert response.status_code in (200, 422), response.text
    strict_json(response.text)


def test_many_names_do_not_hold_the_service_up(client: Client) -> None:
    """A fifth of the allowed size, with its last name twice: reading must not grow with the square."""
    names = [f"k{n}" for n in range(20_000)]
    text = "{" + ",".join(f'"{name}":1' for name in [*names, names[-1]]) + "}"
    start = time.perf_counter()
    response = client.post(EVALUATE, content=text, headers=JSON)
    spent = time.perf_counter() - start
    assert response.status_code == 422
    assert spent < 1.0, f"{spent:.1f} s for {len(text)} bytes"


def test_a_refusal_is_not_larger_than_what_was_sent(client: Client) -> None:
    body = {f"{n:x}": 1 for n in range(20_000)}
    text = json.dumps(body)
    response = client.post(EVALUATE, content=text, headers=JSON)
    assert response.status_code == 422
    assert len(response.content) <= len(text)


def test_a_long_name_is_shortened_like_a_long_value(client: Client) -> None:
    document = client.post(EVALUATE, json={**GOOD, "k" * 5000: 1}).json()
    assert max(len(e["field"]) for e in document["errors"]) <= 200
