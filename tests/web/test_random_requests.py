"""Random valid requests: always an answer, always plain JSON with finite numbers."""

from __future__ import annotations

import math
import random
from collections.abc import Iterator
from typing import Any

import pytest

from tests.web.client import EVALUATE, RULES, Client, strict_json

COUNT, SEED = 300, 20130825


def spread(draw: random.Random, low: float, high: float) -> float:
    return 10 ** draw.uniform(math.log10(low), math.log10(high))


def line(
    draw: random.Random, widest_mm: float, angles: tuple[float, ...], waists: tuple[float, ...]
) -> dict[str, Any]:
    mode = draw.choice(("cw", "pulse", "train"))
    emission: dict[str, Any] = {"mode": mode}
    if mode == "cw":
        emission["power_w"] = spread(draw, 1e-9, 1e5)
    else:
        emission["pulse_s"] = spread(draw, 1e-13, 10)
        by_power = mode == "train" and draw.random() < 0.5
        emission["average_power_w" if by_power else "energy_j"] = spread(draw, 1e-12, 10)
        if mode == "train":
            emission["rate_hz"] = spread(draw, 1e-2, 1e10)

    def axes(value: Any) -> Any:
        return value() if draw.random() < 0.7 else [value(), value()]

    def angle() -> float:
        return draw.choice(angles) if angles and draw.random() < 0.2 else spread(draw, 0.01, 3000)

    beam = {
        "profile": draw.choice(("gaussian", "tophat")),
        "level": draw.choice(("1/e", "1/e2")),
        "diameter_mm": axes(lambda: spread(draw, 0.01, widest_mm)),
        "divergence_mrad": axes(angle),
        "waist_m": draw.choice(waists),
    }
    edges = (180, 302.5, 315, 400, 700, 1050, 1400, 1500, 1800, 2600, 1e6)
    wavelength = draw.choice(edges) if draw.random() < 0.3 else spread(draw, 180, 1e6)
    subtense = draw.choice((0, 1.5, 5, 100, 3141, spread(draw, 0.1, 300)))
    return {"wavelength_nm": wavelength, "emission": emission, "beam": beam, "subtense_mrad": subtense}


def requests(
    seed: int,
    widest_mm: float = 80.0,
    angles: tuple[float, ...] = (),
    waists: tuple[float, ...] = (0, 0, -2.0, 0.5, 30),
) -> Iterator[dict[str, Any]]:
    draw = random.Random(seed)
    for _ in range(COUNT):
        lines = [line(draw, widest_mm, angles, waists) for _ in range(draw.choice((1, 1, 1, 2, 4)))]
        body: dict[str, Any] = {"rules": draw.choice(RULES), "lines": lines}
        if draw.random() < 0.5:
            body["exposure_s"] = draw.choice((1e-13, 0.25, 10, 100, 3e4, spread(draw, 1e-13, 3e4)))
        if draw.random() < 0.3:
            body["viewing"] = {"distance_m": draw.choice((0, spread(draw, 0.01, 1e6)))}
        yield body


def check(client: Client, body: dict[str, Any]) -> None:
    response = client.post(EVALUATE, json=body)
    assert response.status_code == 200, (body, response.text[:300])
    answer = strict_json(response.text)
    for target in ("eye", "skin"):
        found = answer[target]
        distance = found["hazard_distance_m"]
        assert found["hazard_ratio"] >= 0
        assert found["optical_density"] >= 0
        assert (distance == 0) == (found["hazard_zone_m"] is None), body
        if found["hazard_zone_m"] is not None:
            near, far = found["hazard_zone_m"]
            assert far == distance
            assert 0 <= near <= (math.inf if far is None else far)
        for criterion in found["criteria"]:
            assert criterion["limit_j_m2"] > 0
            assert criterion["limit_w_m2"] > 0
    unbounded = any(answer[t]["hazard_distance_m"] is None for t in ("eye", "skin"))
    assert unbounded == any(n["code"] == "unbounded" for n in answer["notices"])


def test_every_ordinary_request_is_answered(client: Client) -> None:
    for body in requests(SEED, waists=(0.0,)):
        check(client, body)


def test_every_request_with_a_distant_waist_is_answered(client: Client) -> None:
    for body in requests(SEED + 2):
        check(client, body)


@pytest.mark.parametrize("angles", [(0.0,), ()], ids=["beams that do not spread", "very wide beams"])
def test_every_odd_request_is_answered(client: Client, angles: tuple[float, ...]) -> None:
    for body in requests(SEED + 1, 80.0 if angles else 1e5, angles):
        check(client, body)
