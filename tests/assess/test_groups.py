"""Lines that add: additivity by band and tissue, and sums over distance, worked out by hand."""

from __future__ import annotations

import math
from typing import Any

import pytest

from service.contract.answer import answer
from service.contract.evaluation import EvaluationResult
from service.contract.request import EvaluationRequest

# Additivity: BGI 832 Tabelle 1 (the IEC table), read. The ratios of the single lines are taken from
# single evaluations, so that only the adding is under test here.


def line(wavelength: float, power: float, **beam: Any) -> dict[str, Any]:
    return {
        "wavelength_nm": wavelength,
        "emission": {"mode": "cw", "power_w": power},
        "beam": {"diameter_mm": 2.0, "divergence_mrad": 1.0, **beam},
    }


def run(*lines: dict[str, Any], exposure: float = 10.0) -> EvaluationResult:
    return answer(EvaluationRequest.model_validate({"exposure_s": exposure, "lines": list(lines)}))


@pytest.mark.parametrize(
    ("first", "second", "eye_adds", "skin_adds"),
    [
        (200.0, 250.0, True, True),
        (200.0, 355.0, False, False),
        (200.0, 532.0, False, False),
        (200.0, 1550.0, False, False),
        (350.0, 380.0, True, True),
        (355.0, 532.0, False, True),
        (355.0, 1550.0, True, True),
        (532.0, 1064.0, True, True),
        (532.0, 1550.0, False, True),
        (1550.0, 10600.0, True, True),
    ],
)
def test_additivity_table(first: float, second: float, eye_adds: bool, skin_adds: bool) -> None:
    a, b = line(first, 0.01), line(second, 0.02)
    both, one, two = run(a, b), run(a), run(b)
    for name, adds in (("eye", eye_adds), ("skin", skin_adds)):
        x, y = getattr(one, name).hazard_ratio, getattr(two, name).hazard_ratio
        expected = x + y if adds else max(x, y)
        assert getattr(both, name).hazard_ratio == pytest.approx(expected, rel=1e-12)


def test_anterior_criterion_stays_apart_from_retina_and_cornea() -> None:
    """A 1390 nm line is judged at the front of the eye; a 1550 nm line there is another band."""
    both, one, two = (
        run(*x) for x in ((line(1390, 0.2), line(1550, 0.1)), (line(1390, 0.2),), (line(1550, 0.1),))
    )
    assert both.eye.hazard_ratio == pytest.approx(max(one.eye.hazard_ratio, two.eye.hazard_ratio), rel=1e-12)
    twice = run(line(1390, 0.2), line(1380, 0.2))
    assert {"anterior"} in [set(s.tissues) for s in twice.eye.sums]


def test_two_equal_lines_reach_as_far_as_one_of_twice_the_power() -> None:
    """Same beam, same limit: the sum of two halves is the whole (scaling by hand)."""
    halves, whole = run(line(532, 0.05), line(532, 0.05)), run(line(532, 0.1))
    assert halves.eye.hazard_distance_m == pytest.approx(whole.eye.hazard_distance_m, rel=1e-9)
    assert halves.eye.optical_density == pytest.approx(whole.eye.optical_density, rel=1e-12)
    assert halves.eye.sums[0].lines == [0, 1]


def test_two_lines_with_different_spread() -> None:
    """Distance where the two ratios add to one, checked by evaluating the sum there by hand.

    Gaussian of 1/e diameter d: fraction 1 - exp(-(7 mm / d)^2), d^2 = d0^2 + (phi z)^2; limit 10 W/m2
    (visible, 10 s, small source).
    """
    result = run(line(532, 0.02, divergence_mrad=0.5), line(633, 0.05, divergence_mrad=2.0))
    z = result.eye.hazard_distance_m
    assert z is not None
    area = math.pi / 4 * 7e-3**2
    total = 0.0
    for power, phi in ((0.02, 0.5e-3), (0.05, 2e-3)):
        d2 = (2e-3**2 + (phi * z) ** 2) / 2
        total += power * (1 - math.exp(-(7e-3**2) / d2)) / area / 10.0
    assert total == pytest.approx(1.0, rel=1e-9)


def test_waists_apart() -> None:
    """One line focused at 2 m, one at 5 m: the worst place and both ends of the zone by a fine scan."""
    a = line(532, 0.004, diameter_mm=0.5, divergence_mrad=20.0, waist_m=2.0)
    b = line(633, 0.004, diameter_mm=0.5, divergence_mrad=20.0, waist_m=5.0)
    result = run(a, b)
    area = math.pi / 4 * 7e-3**2

    def total(z: float) -> float:
        parts = 0.0
        for waist in (2.0, 5.0):
            d2 = (0.5e-3**2 + (20e-3 * (z - waist)) ** 2) / 2
            parts += 0.004 * (1 - math.exp(-(7e-3**2) / d2)) / area / 10.0
        return parts

    places = [k * 1e-4 for k in range(90000)]
    values = [total(z) for z in places]
    exceeded = [z for z, v in zip(places, values, strict=True) if v > 1]
    zone = result.eye.hazard_zone_m
    assert zone is not None
    assert zone[0] == pytest.approx(exceeded[0], abs=1.1e-4)
    assert zone[1] == pytest.approx(exceeded[-1], abs=1.1e-4)
    assert result.eye.hazard_ratio == pytest.approx(max(values), rel=1e-6)
    assert result.eye.hazard_ratio >= max(values) * (1 - 1e-12)
