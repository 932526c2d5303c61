"""A sweep is what single evaluations say, value by value."""

from __future__ import annotations

import copy
import itertools
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.contract.answer import answer
from service.contract.problem import InvalidRequest
from service.contract.request import EvaluationRequest
from service.contract.sweep import FIELDS, Sweep, SweepAnswer, SweepRequest, sweep
from tests.web.client import GOOD, laser

TRAIN = laser(905, {"mode": "train", "average_power_w": 0.02, "pulse_s": 1e-7, "rate_hz": 5000})
GIVEN = laser(1064, {"mode": "train", "energy_j": 1e-4, "pulse_s": 1e-8, "rate_hz": 1000}, rules="eu-2006-25")
PULSE = laser(1064, {"mode": "pulse", "energy_j": 0.05, "pulse_s": 8e-9}, profile="tophat")
OVAL = laser(638, {"mode": "cw", "power_w": 0.5}, diameter_mm=[1.0, 4.0], divergence_mrad=[12.0, 3.0])
SPOT = {**laser(532, {"mode": "cw", "power_w": 2.0}), "bench": [{"element": "diffuser", "reflectance": 0.8}]}
FIBRE = {
    "lines": [
        {
            "wavelength_nm": 808,
            "emission": {"mode": "cw", "power_w": 1.0},
            "beam": {"profile": "fibre_multimode", "numerical_aperture": 0.22, "core_diameter_um": 105},
        }
    ]
}
AIDED = {
    **laser(1064, {"mode": "cw", "power_w": 2.0}),
    "bench": [{"element": "lens", "focal_mm": 200}],
    "viewing": {"aid": {"objective_mm": 50, "magnification": 7}, "visibility_km": 5.0},
}
TWO = {"lines": [GOOD["lines"][0], TRAIN["lines"][0]], "rules": "ansi-z136-1-2014"}
CASES: dict[str, tuple[dict[str, Any], dict[str, Any]]] = {
    "wavelength": (GOOD, {"field": "wavelength_nm", "start": 180.0, "stop": 1e6}),
    "wavelength, usual durations": (TRAIN, {"field": "wavelength_nm", "start": 350.0, "stop": 3000.0}),
    "power": (GOOD, {"field": "power_w", "start": 1e-7, "stop": 100.0}),
    "energy": (PULSE, {"field": "energy_j", "start": 1e-9, "stop": 10.0}),
    "average power": (TRAIN, {"field": "average_power_w", "start": 1e-6, "stop": 10.0}),
    "pulse duration": (GIVEN, {"field": "pulse_s", "start": 1e-13, "stop": 1e-4}),
    "rate, energy held": (GIVEN, {"field": "rate_hz", "start": 1.0, "stop": 1e8}),
    "rate, average held": (TRAIN, {"field": "rate_hz", "start": 1.0, "stop": 1e8}),
    "diameter": (OVAL, {"field": "diameter_mm", "start": 0.1, "stop": 100.0}),
    "divergence": (OVAL, {"field": "divergence_mrad", "start": 0.0, "stop": 50.0, "spacing": "linear"}),
    "exposure": (TWO, {"field": "exposure_s", "start": 1e-6, "stop": 3e4}),
    "through binoculars, behind a lens": (
        AIDED,
        {"field": "power_w", "start": 1e-4, "stop": 10.0, "points": 5},
    ),
    "lit spot": (SPOT, {"field": "power_w", "start": 0.1, "stop": 1000.0, "points": 5}),
    "wavelength in haze": (AIDED, {"field": "wavelength_nm", "start": 300.0, "stop": 5000.0, "points": 5}),
    "second of two lines": (TWO, {"field": "rate_hz", "line": 1, "start": 1.0, "stop": 1e6}),
}


def swept(body: dict[str, Any], asked: dict[str, Any]) -> SweepAnswer:
    request = {"evaluation": EvaluationRequest.model_validate(body), "sweep": Sweep.model_validate(asked)}
    return sweep(SweepRequest.model_validate(request))


def single(body: dict[str, Any], asked: dict[str, Any], value: float) -> EvaluationRequest:
    """The request with the value typed in by hand."""
    changed = copy.deepcopy(body)
    name = asked["field"]
    if name == "exposure_s":
        changed[name] = value
    else:
        line = changed["lines"][asked.get("line", 0)]
        part = line[FIELDS[name]] if FIELDS[name] else line
        old = part[name]
        part[name] = [value, value * old[1] / old[0]] if isinstance(old, list) else value
    return EvaluationRequest.model_validate(changed)


@pytest.mark.parametrize(("body", "asked"), CASES.values(), ids=CASES.keys())
def test_sweep_equals_single_answers(body: dict[str, Any], asked: dict[str, Any]) -> None:
    found = swept(body, {"points": 23, **asked})
    assert len(found.values) == asked.get("points", 23)
    for k, value in enumerate(found.values):
        one = answer(single(body, asked, value))
        assert (found.eye_aided is None) == (one.eye_aided is None)
        for key, _, many in found.targets():
            target = getattr(one, key)
            criterion = target.criteria[target.governing]
            zone = target.hazard_zone_m
            assert many.hazard_ratio[k] == pytest.approx(target.hazard_ratio, rel=1e-12)
            if target.hazard_distance_m is None:
                assert many.hazard_distance_m[k] is None
            else:
                assert many.hazard_distance_m[k] == pytest.approx(target.hazard_distance_m, rel=1e-9)
            assert many.hazard_near_m[k] == (None if zone is None else pytest.approx(zone[0], rel=1e-9))
            assert many.optical_density[k] == pytest.approx(target.optical_density, rel=1e-9, abs=1e-12)
            assert many.limit_j_m2[k] == pytest.approx(criterion.limit_j_m2, rel=1e-12)
            assert many.limit_w_m2[k] == pytest.approx(criterion.limit_w_m2, rel=1e-12)
            assert (many.rule[k], many.row[k]) == (criterion.rule, criterion.row)
            assert (many.tissue[k], many.known[k]) == (criterion.tissue, criterion.known)
            assert many.line[k] == criterion.line
        assert {s: names[k] for s, names in found.hazard_class.items()} == {
            c.scheme: c.hazard_class for c in one.classification
        }
        line = 0 if asked["field"] == "exposure_s" else asked.get("line", 0)
        assert found.exposure_s[k] == one.durations[line].exposure_s
    assert found.rules.digest == one.rules.digest
    assert found.cautions == one.cautions


def test_passes_of_any_size_give_the_same(monkeypatch: pytest.MonkeyPatch) -> None:
    asked = {"field": "rate_hz", "line": 1, "start": 1.0, "stop": 1e6, "points": 40}
    whole = swept(TWO, asked)
    monkeypatch.setattr("service.contract.sweep.LINES_AT_ONCE", 14)
    assert swept(TWO, asked) == whole


def test_limit_over_wavelength_is_the_printed_one() -> None:
    """0.25 s, 400 to 700 nm: 18 t^0.75 J/m2; above 700 nm times C_A = 10^(0.002 (w - 700)) (ICNIRP 2013,
    from memory), both for the eye as exposure over T."""
    found = swept(
        GOOD, {"field": "wavelength_nm", "start": 650.0, "stop": 800.0, "points": 4, "spacing": "linear"}
    )
    assert found.values == [650.0, 700.0, 750.0, 800.0]
    printed = 18.0 * 0.25**0.75
    expected = [printed, printed, printed * 10**0.1, printed * 10**0.2]
    assert found.eye.limit_j_m2 == pytest.approx(expected, rel=1e-12)


def test_without_a_chosen_duration_each_wavelength_takes_its_own() -> None:
    """0.25 s in the visible, 100 s beyond 700 nm, 3e4 s below 400 nm (TROS Laserstrahlung part 2, 4.1)."""
    body = {k: v for k, v in GOOD.items() if k != "exposure_s"}
    found = swept(
        body, {"field": "wavelength_nm", "start": 300.0, "stop": 900.0, "points": 3, "spacing": "linear"}
    )
    assert found.exposure_s == [3e4, 0.25, 100.0]
    assert any("conventional" in r for r in found.remarks)


@settings(max_examples=60, deadline=None)
@given(st.floats(1e-9, 1e6), st.floats(1e-6, 1e6), st.integers(2, 300), st.sampled_from(["log", "linear"]))
def test_values_rise_from_end_to_end(start: float, more: float, points: int, spacing: str) -> None:
    stop = start * (1 + more)
    values = Sweep.model_validate(
        {"field": "power_w", "start": start, "stop": stop, "points": points, "spacing": spacing}
    ).values()
    assert len(values) == points
    assert (values[0], values[-1]) == (start, stop)
    assert all(a < b for a, b in itertools.pairwise(values))


@pytest.mark.parametrize(
    ("body", "asked", "field"),
    [
        (GOOD, {"field": "rate_hz", "start": 1.0, "stop": 2.0}, "sweep.field"),
        (TRAIN, {"field": "energy_j", "start": 1.0, "stop": 2.0}, "sweep.field"),
        (GOOD, {"field": "power_w", "line": 1, "start": 1.0, "stop": 2.0}, "sweep.line"),
        (GOOD, {"field": "wavelength_nm", "start": 1.0, "stop": 500.0}, "sweep.start"),
        (GOOD, {"field": "wavelength_nm", "start": 400.0, "stop": 2e6}, "sweep.stop"),
        (GOOD, {"field": "exposure_s", "start": 1.0, "stop": 1e6}, "sweep.stop"),
        (SPOT, {"field": "power_w", "start": 1.0, "stop": 2.0, "points": 302}, "sweep.points"),
        (FIBRE, {"field": "divergence_mrad", "start": 1.0, "stop": 2.0}, "sweep.field"),
        (GOOD, {"field": "divergence_mrad", "start": 1e-9, "stop": 1.0}, "sweep.start"),
    ],
)
def test_what_cannot_run_is_refused_by_name(body: dict[str, Any], asked: dict[str, Any], field: str) -> None:
    with pytest.raises(InvalidRequest) as caught:
        swept(body, {"points": 5, **asked})
    assert [e.field for e in caught.value.errors] == [field]
    assert caught.value.errors[0].allowed
