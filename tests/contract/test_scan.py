"""Sweeping beams: the criterion at the solved distance by hand, the standing beam as the bound."""

from __future__ import annotations

import math
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import integrate

from service.contract.answer import answer
from service.contract.evaluation import EvaluationResult
from service.contract.request import EvaluationRequest

EXAMPLES = settings(max_examples=40, deadline=None, derandomize=True)
LINE = {"element": "scanner", "angle_deg": 30, "sweeps_hz": 100}
#: Limiting aperture of the eye, 400 to 1400 nm [m].
PUPIL = 7e-3


def run(scanner: dict[str, Any] | None = LINE, power: float = 5.0, **more: Any) -> EvaluationResult:
    body = {
        "exposure_s": 0.25,
        "lines": [
            {
                "wavelength_nm": 532,
                "emission": {"mode": "cw", "power_w": power},
                "beam": {"diameter_mm": 2, "divergence_mrad": 1, "level": "1/e"},
                **more.pop("line", {}),
            }
        ],
        "bench": [] if scanner is None else [scanner],
        **more,
    }
    return answer(EvaluationRequest.model_validate(body))


def far(target: Any) -> float:
    assert target.hazard_distance_m is not None
    return float(target.hazard_distance_m)


def test_one_pass_meets_the_limit_at_the_solved_distance() -> None:
    """18 t^0.75 J/m2 (ICNIRP 2013, from memory) for one pass, doubled in time at the turning point; energy
    and duration of the pass by independent quadrature over the pupil."""
    result = run()
    z = far(result.eye)
    d = math.hypot(2e-3, 1e-3 * z)
    chord, _ = integrate.quad(
        lambda y: (
            2 * math.sqrt(PUPIL**2 / 4 - y * y) * 2 / (math.sqrt(math.pi) * d) * math.exp(-((2 * y / d) ** 2))
        ),
        -PUPIL / 2,
        PUPIL / 2,
    )
    inside = -math.expm1(-((PUPIL / d) ** 2))
    speed = math.radians(30) * 100 * z
    duration = 2 * chord / inside / speed
    assert 5.0 * inside * duration / (math.pi / 4 * PUPIL**2) == pytest.approx(18 * duration**0.75, rel=1e-6)
    assert result.scan is not None
    assert result.scan.lines[0].pass_s == pytest.approx(duration, rel=1e-6)
    assert result.scan.lines[0].passes_hz == 50.0


def test_the_scanner_may_stop() -> None:
    """The failure case is the beam without a scanner, and eyewear and class follow it."""
    swept, plain = run(), run(None)
    assert swept.scan is not None
    assert swept.scan.failure_eye == plain.eye
    assert swept.scan.failure_skin == plain.skin
    assert far(swept.eye) < far(plain.eye)
    assert swept.protection == plain.protection
    assert swept.classification == plain.classification
    assert any(n.code == "scanner-may-stop" and "out to 500" in n.text for n in swept.notices)


def test_many_passes_count_by_their_mean() -> None:
    """A fast sweep of a faint wide line: the passes of 0.25 s together give the mean irradiance, which is the
    power over the swept strip of beam width x angle x distance (flux by hand, to the strip's profile)."""
    fast = {**LINE, "sweeps_hz": 1e6, "angle_deg": 90}
    result = run(fast, viewing={"distance_m": 3.0})
    assert result.eye.at_distance is not None
    average = [c.rule for c in result.eye.criteria].index("average")
    d = math.hypot(2e-3, 3e-3)
    # The pupil is wider than the beam, so its mean chord enters instead of the irradiance on the axis.
    chord, _ = integrate.quad(
        lambda y: (
            2 * math.sqrt(PUPIL**2 / 4 - y * y) * 2 / (math.sqrt(math.pi) * d) * math.exp(-((2 * y / d) ** 2))
        ),
        -PUPIL / 2,
        PUPIL / 2,
    )
    mean = 5.0 * chord / (math.pi / 2 * 3.0) / (math.pi / 4 * PUPIL**2)
    assert result.eye.at_distance.criteria_hazard_ratio[average] == pytest.approx(
        mean / (18 * 0.25**-0.25), rel=1e-6
    )


def test_pulses_are_not_credited() -> None:
    train = {"mode": "train", "energy_j": 1e-4, "pulse_s": 1e-8, "rate_hz": 1000}
    swept, plain = run(line={"emission": train}), run(None, line={"emission": train})
    assert far(swept.eye) == pytest.approx(far(plain.eye), rel=1e-9)
    assert any(n.code == "sweep-not-credited" for n in swept.notices)


@pytest.mark.parametrize(("rows", "height"), [(2, None), (1, 10.0)])
def test_a_raster_needs_rows_and_height(rows: int, height: float | None) -> None:
    with pytest.raises(ValueError, match="raster"):
        run({**LINE, "rows": rows, "height_deg": height})


@EXAMPLES
@given(
    st.floats(1, 120),
    st.floats(1, 1e5),
    st.sampled_from(["even", "sinusoidal"]),
    st.sampled_from([1, 50, 1000]),
    st.floats(1e-3, 1e3),
    st.sampled_from(["icnirp-2013", "eu-2006-25", "iec-60825-1-2014", "ansi-z136-1-2014"]),
    st.sampled_from([400.0, 532.0, 905.0, 1550.0]),
    st.sampled_from([0.0, 50.0]),
)
def test_never_worse_than_standing_still(
    angle: float,
    sweeps: float,
    motion: str,
    rows: int,
    power: float,
    rules: str,
    wavelength: float,
    focus: float,
) -> None:
    """At no distance does a sweeping beam exceed the standing one; more power never reaches less far."""
    scanner = {"element": "scanner", "angle_deg": angle, "sweeps_hz": sweeps, "motion": motion}
    if rows > 1:
        scanner |= {"rows": rows, "height_deg": 20}
    line = {"wavelength_nm": wavelength, "beam": {"diameter_mm": 2, "divergence_mrad": 1, "waist_m": focus}}
    over = {"over_distance": {"from_m": 0.01, "to_m": 1000, "points": 40}}
    swept = run(scanner, power, rules=rules, line=line, viewing=over)
    still = run(None, power, rules=rules, line=line, viewing=over)
    for one, bound in ((swept.eye, still.eye), (swept.skin, still.skin)):
        assert far(one) <= far(bound) * (1 + 1e-9)
        assert one.hazard_ratio <= bound.hazard_ratio * (1 + 1e-9)
    assert swept.over_distance is not None
    assert still.over_distance is not None
    pairs = zip(swept.over_distance.eye.hazard_ratio, still.over_distance.eye.hazard_ratio, strict=True)
    assert all(a <= b * (1 + 1e-9) for a, b in pairs)
    places = zip(swept.over_distance.distance_m, swept.over_distance.eye.hazard_ratio, strict=True)
    assert all(ratio <= 1.0 + 1e-9 for z, ratio in places if z > far(swept.eye))
    assert far(run(scanner, power * 3, rules=rules, line=line).eye) >= far(swept.eye) * (1 - 1e-9)
