"""The worst case is no better than anything the tolerances allow."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from service.contract.tolerance import ToleranceRequest
from service.contract.tolerance_answer import _Judge, _turn, draw_values, tolerance
from service.contract.tolerance_fields import spreads
from tests.tolerance.test_spread import CW, PULSE, TRAIN
from tests.web.client import RULES

percent = st.floats(0.0, 30.0)
emission = st.one_of(
    st.builds(lambda p: {"mode": "cw", "power_w": p}, st.floats(1e-4, 10.0)),
    st.builds(
        lambda q, t: {"mode": "pulse", "energy_j": q, "pulse_s": t},
        st.floats(1e-8, 1e-2),
        st.floats(-11.0, 0.0).map(lambda e: 10.0**e),
    ),
    st.builds(
        lambda q, t, f: {"mode": "train", "energy_j": q, "pulse_s": t, "rate_hz": f},
        st.floats(1e-9, 1e-4),
        st.floats(-11.0, -6.0).map(lambda e: 10.0**e),
        st.floats(0.0, 5.0).map(lambda e: 10.0**e),
    ),
)
line = st.builds(
    lambda w, e, d, a, s: {
        "wavelength_nm": w,
        "emission": e,
        "beam": {"diameter_mm": d, "divergence_mrad": a},
        "subtense_mrad": s,
    },
    st.floats(200.0, 2500.0),
    emission,
    st.floats(0.1, 20.0),
    st.floats(0.1, 50.0),
    st.floats(1.5, 60.0),
)


def tolerances_of(body: dict[str, Any], each: list[float], normal: bool) -> list[dict[str, Any]]:
    """Tolerances of every figure of every line."""
    found = []
    for k, one in enumerate(body["lines"]):
        names = [f"emission.{n}" for n in one["emission"] if n != "mode"]
        names += ["beam.diameter_mm", "beam.divergence_mrad", "wavelength_nm", "subtense_mrad"]
        found += [f"lines.{k}.{n}" for n in names]
    return [
        {"field": f, "plus_minus_percent": p / 3.0, "meaning": "normal" if normal else "uniform"}
        for f, p in zip(found, each * 3, strict=False)
        if not f.endswith("wavelength_nm") or p < 5.0
    ]


@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(
    st.lists(line, min_size=1, max_size=2),
    st.lists(percent, min_size=8, max_size=8),
    st.booleans(),
    st.sampled_from(RULES),
)
def test_worst_case_is_no_better_than_any_draw(
    lines: list[dict[str, Any]], each: list[float], normal: bool, rules: str
) -> None:
    body = {"lines": lines, "rules": rules}
    wanted = {"evaluation": body, "tolerances": tolerances_of(body, each, normal), "draws": 100, "seed": 1}
    no_draw_is_worse(wanted)


def no_draw_is_worse(wanted: dict[str, Any], draws: int = 400) -> None:
    """Draws of another seed than the answer's own, so that the search must find the worst by itself."""
    request = ToleranceRequest.model_validate(wanted)
    worst = tolerance(request).worst_case
    judge, found = _Judge(request), spreads(request)
    drawn = judge(_turn(found, draw_values(found, draws, seed=77)))
    slack = 1.0 + 1e-9
    assert drawn.eye_ratio.max() <= worst.eye_hazard_ratio * slack
    assert drawn.skin_ratio.max() <= worst.skin_hazard_ratio * slack
    for name in ("eye", "skin"):
        most = getattr(worst, f"{name}_hazard_distance_m")
        assert most is None or getattr(drawn, f"{name}_distance_m").max() <= most * slack + 1e-12
        assert getattr(drawn, f"{name}_density").max() <= getattr(worst, f"{name}_optical_density") + 1e-9
    for key, numbers in drawn.classes.items():
        names = [c.name for c in judge.schemes[key].scheme.classes]
        assert numbers.max() <= names.index(worst.classes[key])


@settings(max_examples=150, deadline=None)
@given(
    line,
    st.sampled_from(RULES),
    st.sampled_from(["emitted", "diameter", "divergence"]),
    st.floats(1.001, 3.0),
)
def test_known_directions_are_true(one: dict[str, Any], rules: str, figure: str, factor: float) -> None:
    """More power is never safer; a narrower or less spreading beam is never safer: the proof of the "
    "corners."""
    emission = one["emission"]
    field = {
        "emitted": "emission.power_w" if emission["mode"] == "cw" else "emission.energy_j",
        "diameter": "beam.diameter_mm",
        "divergence": "beam.divergence_mrad",
    }[figure]
    wanted = {
        "evaluation": {"lines": [one], "rules": rules},
        "tolerances": [{"field": f"lines.0.{field}", "plus_minus": 0.0}],
    }
    request = ToleranceRequest.model_validate(wanted)
    found = spreads(request)
    value = found[0].value
    low, high = value, value * factor
    if figure != "emitted":
        low, high = high, low
    safer, worse = low, high
    result = _Judge(request)(_turn(found, {f"lines.0.{field}": np.array([safer, worse])}))
    assert result.eye_ratio[0] <= result.eye_ratio[1] * (1.0 + 1e-12)
    assert result.skin_ratio[0] <= result.skin_ratio[1] * (1.0 + 1e-12)
    assert result.eye_distance_m[0] <= result.eye_distance_m[1] * (1.0 + 1e-9)
    assert result.skin_distance_m[0] <= result.skin_distance_m[1] * (1.0 + 1e-9)
    for numbers in result.classes.values():
        assert numbers[0] <= numbers[1]


def test_a_row_that_changes_inside_the_range_is_found() -> None:
    """695 to 705 nm with its usual duration: the longer one from 700 nm on (100 s) is the stricter."""
    wanted = {
        "evaluation": {"lines": [{**CW, "wavelength_nm": 699.0, "subtense_mrad": 1.5}]},
        "tolerances": [{"field": "lines.0.wavelength_nm", "low": 695.0, "high": 705.0}],
        "draws": 100,
    }
    worst = tolerance(ToleranceRequest.model_validate(wanted)).worst_case
    assert worst.searched == ["lines.0.wavelength_nm"]
    assert worst.at["lines.0.wavelength_nm"] == pytest.approx(700.0, abs=1e-6)


@pytest.mark.parametrize(
    "body", [{"lines": [CW]}, {"lines": [TRAIN]}, {"lines": [PULSE]}, {"lines": [CW, TRAIN, PULSE]}]
)
@pytest.mark.parametrize("meaning", ["uniform", "normal"])
def test_without_tolerance_all_three_agree(body: dict[str, Any], meaning: str) -> None:
    fields = [f"lines.{k}.beam.divergence_mrad" for k in range(len(body["lines"]))]
    tolerances = [{"field": f, "plus_minus_percent": 0.0, "meaning": meaning} for f in fields]
    wanted = {"evaluation": body, "tolerances": tolerances, "draws": 200}
    result = tolerance(ToleranceRequest.model_validate(wanted))
    for d in result.distributions:
        nominal = getattr(result.nominal, d.figure)
        assert getattr(result.worst_case, d.figure) == nominal
        assert d.interval_95 == (nominal, nominal)
        assert d.mean == pytest.approx(nominal, rel=1e-12)
        assert d.standard_deviation == pytest.approx(0.0, abs=1e-9 * (nominal or 1.0))
    assert result.worst_case.classes == result.nominal.classes
    assert {c.share for c in result.classes} == {1.0}
