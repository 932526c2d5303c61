"""Beams outdoors: published distances, the eye's sensitivity, lines that add."""

from __future__ import annotations

import math
from typing import Any

import pytest

from service.contract.airspace import Airspace
from service.contract.answer import answer
from service.contract.request import EvaluationRequest

FOOT = 0.3048


def line(wavelength: float, emission: dict[str, Any], divergence: float = 1.0) -> dict[str, Any]:
    beam = {"diameter_mm": 1, "divergence_mrad": divergence, "level": "1/e"}
    return {"wavelength_nm": wavelength, "emission": emission, "beam": beam}


def cw(power: float) -> dict[str, Any]:
    return {"mode": "cw", "power_w": power}


def airspace(*lines: dict[str, Any], **viewing: Any) -> Airspace:
    body = {"lines": list(lines), "viewing": {"outdoors": True, **viewing}}
    found = answer(EvaluationRequest.model_validate(body)).airspace
    assert found is not None
    return found


def reach(found: Airspace, zone: str) -> float:
    distance = next(z.distance_m for z in found.zones if z.zone == zone)
    assert distance is not None
    return distance


@pytest.mark.parametrize(
    ("power", "divergence", "zone", "feet", "digits"),
    [
        # Pages for pilots on laser pointers and shows (read; powers of 5 mW from memory), without a visual
        # correction, so at 555 nm, where V = 1.
        (6, 1.1, "laser-free", 368_000, 1000),
        (0.005, 1.0, "sensitive", 262, 1),
        (0.005, 1.0, "critical", 1171, 1),
    ],
)
def test_published_distances(power: float, divergence: float, zone: str, feet: float, digits: float) -> None:
    found = airspace(line(555, cw(power), divergence))
    assert found.luminous_efficiency == [1.0]
    assert reach(found, zone) == pytest.approx(feet * FOOT, abs=digits * FOOT)


def test_distance_by_hand() -> None:
    """E = V P / (pi d^2 / 4): d = sqrt(4 V P / (pi E)), z = sqrt(d^2 - d0^2) / phi. V(630) = 0.265 (CRC)."""
    found = airspace(line(630, cw(0.1)))
    for zone, level in (("laser-free", 5e-4), ("critical", 0.05), ("sensitive", 1.0)):
        d = math.sqrt(4 * 0.265 * 0.1 / (math.pi * level))
        assert reach(found, zone) == pytest.approx(math.sqrt(d * d - 1e-6) / 1e-3, rel=1e-9)
    assert found.visual_power_w == pytest.approx(0.0265, rel=1e-12)


def test_between_rows_log_v_is_linear() -> None:
    """CRC: V(530) = 0.862, V(540) = 0.954; CIE tables give 0.885 at 532 nm (from memory)."""
    value = airspace(line(532, cw(1))).luminous_efficiency[0]
    assert value == pytest.approx(0.862**0.8 * 0.954**0.2, rel=1e-12)
    assert value == pytest.approx(0.885, rel=0.01)


def test_invisible_light_dazzles_nobody() -> None:
    found = airspace(line(1064, cw(100)))
    assert [z.distance_m for z in found.zones] == [0.0, 0.0, 0.0]
    assert found.eye_hazard_distance_m is not None
    assert found.eye_hazard_distance_m > 0


def test_lines_add_and_trains_count_by_their_mean() -> None:
    train = {"mode": "train", "energy_j": 1e-3, "pulse_s": 1e-8, "rate_hz": 100}
    both = airspace(line(555, cw(0.2)), line(555, train))
    assert reach(both, "critical") == pytest.approx(reach(airspace(line(555, cw(0.3))), "critical"), rel=1e-9)


def test_haze_shortens_the_distance() -> None:
    """At the hazy distance the clear irradiance times exp(-mu z) is the level; mu = 3.912 / 10 km."""
    hazy = reach(airspace(line(550, cw(5)), visibility_km=10), "laser-free")
    d2 = 1e-6 + (1e-3 * hazy) ** 2
    irradiance = 0.99495 * 5 / (math.pi / 4 * d2) * math.exp(-3.912e-4 * hazy)
    assert irradiance == pytest.approx(5e-4, rel=1e-9)


def test_parallel_beam_never_falls_below() -> None:
    found = airspace(line(555, cw(1), divergence=0))
    assert [z.distance_m for z in found.zones] == [None, None, None]


def test_levels_are_from_memory_and_the_authority_decides() -> None:
    found = airspace(line(555, cw(1)))
    assert {z.known for z in found.zones} == {"memory"}
    assert "authority decides" in found.reminder
