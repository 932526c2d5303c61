"""Draws go through the same engine as single lasers and give the same figures."""

from __future__ import annotations

import copy
from typing import Any

import numpy as np
import pytest

from service.contract.answer import answer
from service.contract.request import EvaluationRequest
from service.contract.tolerance import ToleranceRequest
from service.contract.tolerance_answer import _Judge, _turn, draw_values
from service.contract.tolerance_fields import set_field, spreads

CW: dict[str, Any] = {
    "wavelength_nm": 690.0,
    "emission": {"mode": "cw", "power_w": 0.02},
    "beam": {"diameter_mm": 2.0, "divergence_mrad": 1.0},
    "subtense_mrad": 4.0,
}
TRAIN: dict[str, Any] = {
    "wavelength_nm": 1064.0,
    "emission": {"mode": "train", "average_power_w": 0.5, "pulse_s": 1e-8, "rate_hz": 2e4},
    "beam": {"diameter_mm": [1.0, 4.0], "divergence_mrad": [12.0, 3.0], "level": "1/e"},
}
PULSE: dict[str, Any] = {
    "wavelength_nm": 1540.0,
    "emission": {"mode": "pulse", "energy_j": 0.02, "pulse_s": 1e-8},
    "beam": {
        "profile": "tophat",
        "diameter_mm": 6.0,
        "divergence_mrad": 0.5,
        "waist_m": 2.0,
        "diameter_at": "exit",
    },
}
FIELDS = {
    "cw": ({"lines": [CW]}, ["emission.power_w", "wavelength_nm", "subtense_mrad", "beam.diameter_mm"]),
    "train": (
        {"lines": [TRAIN], "exposure_s": 3.0},
        ["emission.average_power_w", "emission.rate_hz", "emission.pulse_s", "beam.divergence_mrad.0"],
    ),
    "pulse": (
        {"lines": [PULSE], "rules": "eu-2006-25"},
        ["emission.energy_j", "beam.diameter_mm", "beam.divergence_mrad", "beam.waist_m"],
    ),
    "both axes": ({"lines": [TRAIN]}, ["beam.diameter_mm", "beam.divergence_mrad", "wavelength_nm"]),
}


@pytest.mark.parametrize("name", FIELDS)
def test_each_draw_is_a_single_evaluation(name: str) -> None:
    body, fields = FIELDS[name]
    compare(body, [f"lines.0.{f}" for f in fields])


def test_three_lines_at_once() -> None:
    fields = [f"lines.{k}.{f}" for k, n in enumerate(("cw", "train", "pulse")) for f in FIELDS[n][1]]
    compare({"lines": [CW, TRAIN, PULSE], "exposure_s": 1.0}, [*fields, "exposure_s"])


def compare(body: dict[str, Any], fields: list[str], draws: int = 15) -> None:
    """Every figure of some draws against the one-laser path, at the same values put into the request."""
    tolerances = [{"field": f, "plus_minus_percent": 8.0} for f in fields]
    request = ToleranceRequest.model_validate({"evaluation": body, "tolerances": tolerances})
    found = spreads(request)
    values = draw_values(found, draws, seed=3)
    judge = _Judge(request)
    drawn = judge(_turn(found, values))
    for k in range(draws):
        single = copy.deepcopy(request.evaluation.model_dump(mode="json", exclude_none=True))
        for field in fields:
            set_field(single, field, float(values[field][k]))
        result = answer(EvaluationRequest.model_validate(single))
        for target in ("eye", "skin"):
            one = getattr(result, target)
            assert getattr(drawn, f"{target}_ratio")[k] == pytest.approx(one.hazard_ratio, rel=1e-11)
            distance = getattr(drawn, f"{target}_distance_m")[k]
            assert distance == pytest.approx(one.hazard_distance_m, rel=1e-9, abs=1e-9)
        for one_class in result.classification:
            assert judge.name(one_class.scheme, drawn.classes[one_class.scheme][k]) == one_class.hazard_class


def test_draws_fill_their_range_and_repeat_with_their_seed() -> None:
    tolerances = [
        {"field": "lines.0.emission.power_w", "low": 0.01, "high": 0.03},
        {"field": "lines.0.beam.diameter_mm", "plus_minus": 0.2, "meaning": "normal"},
    ]
    request = ToleranceRequest.model_validate({"evaluation": {"lines": [CW]}, "tolerances": tolerances})
    found = spreads(request)
    first, again = (draw_values(found, 20_000, seed=9) for _ in range(2))
    assert all(np.array_equal(first[f], again[f]) for f in first)
    assert not np.array_equal(
        first["lines.0.emission.power_w"], draw_values(found, 20_000, 10)["lines.0.emission.power_w"]
    )
    power, diameter = first.values()
    assert 0.01 <= power.min() < 0.0101
    assert 0.0299 < power.max() <= 0.03
    # Two standard deviations are 0.2 mm; nothing lies beyond three.
    assert diameter.std() == pytest.approx(0.1 * 0.98658, rel=0.02)  # truncated at 3: variance 0.97334
    assert abs(diameter - 2.0).max() <= 0.3
