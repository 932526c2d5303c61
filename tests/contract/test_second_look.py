"""What the answer says where a blink or a fixed source angle is too kind an assumption."""

from __future__ import annotations

import math
from typing import Any

import pytest

from tests.web.client import Client, laser


def told(client: Client, body: dict[str, Any], code: str) -> list[str]:
    return [n["text"] for n in client.evaluate(body)["notices"] if n["code"] == code]


def cw(power_w: float, wavelength_nm: float = 532, **more: Any) -> dict[str, Any]:
    return laser(wavelength_nm, {"mode": "cw", "power_w": power_w}, **more)


def test_skin_is_judged_for_ten_seconds_too(client: Client) -> None:
    """0.1 W in 2 mm (1/e2) through 3.5 mm: 1 - exp(-2 x 3.5^2 / 4) = 0.99781; over 9.6211e-6 m2.

    10 371 W/m2 against 2000 W/m2 (ICNIRP 2013, skin, from 10 s on): 5.19 times the limit.
    """
    (text,) = told(client, cw(0.1), "skin-longer-exposure")
    share = 1 - math.exp(-2 * 3.5**2 / 4)
    ratio = 0.1 * share / (math.pi / 4 * 3.5e-3**2) / 2000
    assert ratio == pytest.approx(5.19, abs=5e-3)
    assert "5.19 times its limit" in text
    # d_1/e2 where the share falls to 1 / (P / A / limit): 2 x 3.5^2 / d^2 = -ln(1 - 0.19242), d = 2 + 1e-3 z
    wanted = 1 / (0.1 / (math.pi / 4 * 3.5e-3**2) / 2000)
    diameter = math.sqrt(-2 * 3.5**2 / math.log(1 - wanted))
    assert f"out to {math.ceil(math.sqrt(diameter**2 - 4) * 100) / 100:.2f} m" in text


@pytest.mark.parametrize(
    "body",
    [cw(0.1) | {"exposure_s": 1}, cw(0.01), cw(0.1, 1064)],
    ids=["a longer duration was chosen", "weak", "no blink in the infrared"],
)
def test_otherwise_nothing_is_said_of_skin(client: Client, body: dict[str, Any]) -> None:
    assert told(client, body, "skin-longer-exposure") == []


def test_a_source_angle_tells_what_a_point_source_would_do(client: Client) -> None:
    """The distance named is the one that the same laser has without the angle."""
    emission = {"mode": "pulse", "energy_j": 0.05, "pulse_s": 8e-9}
    body = laser(1064, emission, diameter_mm=6, divergence_mrad=5)
    far = client.evaluate(body)["eye"]["hazard_distance_m"]
    body["lines"][0]["subtense_mrad"] = 50
    (text,) = told(client, body, "extended-source")
    assert f"out to {math.ceil(far * 10) / 10:.1f} m" in text
    body["lines"][0]["subtense_mrad"] = 1.5
    assert told(client, body, "extended-source") == []
    weak = laser(1064, {**emission, "energy_j": 1e-9})
    weak["lines"][0]["subtense_mrad"] = 50
    assert told(client, weak, "extended-source") == []
