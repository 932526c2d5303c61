"""Lit spots: Lambert's law by hand, the limit that holds at the solved distance, viewing all day."""

from __future__ import annotations

import math
from typing import Any

import pytest
from hypothesis import Phase, given, settings
from hypothesis import strategies as st

from service.contract.answer import answer
from service.contract.evaluation import EvaluationResult
from service.contract.request import EvaluationRequest

EXAMPLES = settings(max_examples=40, deadline=None, derandomize=True, phases=(Phase.explicit, Phase.generate))
QUARTER = 0.25
#: 18 t^0.75 J/m2 over t, 400 to 700 nm, at 0.25 s (ICNIRP 2013, from memory).
GLANCE = 18 * QUARTER**0.75 / QUARTER


def run(
    power: float = 1000.0,
    spot_mm: float = 0.5,
    wavelength: float = 532,
    exposure: float = QUARTER,
    rules: str = "icnirp-2013",
    viewing: dict[str, Any] | None = None,
    line: dict[str, Any] | None = None,
    **diffuser: Any,
) -> EvaluationResult:
    body = {
        "rules": rules,
        "exposure_s": exposure,
        "lines": [
            {
                "wavelength_nm": wavelength,
                "emission": {"mode": "cw", "power_w": power},
                "beam": {"diameter_mm": spot_mm, "divergence_mrad": 0, "level": "1/e"},
                **(line or {}),
            }
        ],
        "bench": [{"element": "diffuser", **diffuser}],
        "viewing": viewing or {},
    }
    return answer(EvaluationRequest.model_validate(body))


def distance(result: EvaluationResult) -> float:
    assert result.eye.hazard_distance_m is not None
    return result.eye.hazard_distance_m


@pytest.mark.parametrize(("reflectance", "angle"), [(1.0, 0.0), (0.8, 0.0), (0.5, 60.0), (1.0, 45.0)])
def test_small_spot_by_lamberts_law(reflectance: float, angle: float) -> None:
    """r = sqrt(rho P cos(theta) / (pi E)) (ANSI Z136.1 appendix B, from memory)."""
    result = run(reflectance=reflectance, viewing_deg=angle)
    expected = math.sqrt(reflectance * 1000 * math.cos(math.radians(angle)) / (math.pi * GLANCE))
    assert distance(result) == pytest.approx(expected, rel=1e-6)
    assert result.eye.worst_place_m == 0.1


@pytest.mark.parametrize("spot_mm", [3.0, 20.0, 90.0, 300.0])
def test_the_limit_is_the_one_at_the_solved_distance(spot_mm: float) -> None:
    """alpha = d / r there; C_E = alpha / 1.5, beyond 100 mrad alpha^2 / 150 (ICNIRP 2013, from memory)."""
    result = run(2e5, spot_mm=spot_mm)
    r = distance(result)
    alpha = max(spot_mm / r, 1.5)
    c_e = alpha / 1.5 * max(1.0, alpha / 100.0)
    assert 2e5 / (math.pi * r * r) == pytest.approx(GLANCE * c_e, rel=1e-9)
    assert result.diffuse is not None
    seen = result.diffuse.lines[0].subtense_at_hazard_distance_mrad
    assert seen == pytest.approx(spot_mm / r, rel=1e-9) or alpha == 1.5


def test_oblong_spot_counts_with_its_mean_width() -> None:
    """Arithmetic mean of both axes (IEC 60825-1, from memory), where none is wider than alpha_max."""
    beam = {"diameter_mm": [40, 20], "divergence_mrad": 0, "level": "1/e"}
    result = run(2e3, line={"beam": beam})
    r = distance(result)
    assert 2e3 / (math.pi * r * r) == pytest.approx(GLANCE * (40 + 20) / 2 / r / 1.5, rel=1e-9)
    # A stripe wider than alpha_max counts no more than by its smaller width.
    stripe = run(1e6, line={"beam": {**beam, "diameter_mm": [3e4, 10]}})
    r = distance(stripe)
    assert 1e6 / (math.pi * r * r) == pytest.approx(GLANCE * max(1.5, 10 / r) / 1.5, rel=1e-9)


def test_spot_after_space_and_lens() -> None:
    """The spot is the beam at the diffuser: 10 m at 2 mrad behind a 4 mm waist, sqrt(4^2 + 20^2) mm."""
    beam = {"diameter_mm": 4, "divergence_mrad": 2, "level": "1/e"}
    body = {
        "exposure_s": QUARTER,
        "lines": [{"wavelength_nm": 532, "emission": {"mode": "cw", "power_w": 1e4}, "beam": beam}],
        "bench": [
            {"element": "space", "length_m": 10},
            {"element": "window", "transmittance": 0.5},
            {"element": "diffuser", "reflectance": 0.5},
        ],
    }
    result = answer(EvaluationRequest.model_validate(body))
    assert result.diffuse is not None
    assert result.diffuse.lines[0].spot_mm == pytest.approx((math.hypot(4, 20),) * 2, rel=1e-12)
    r = distance(result)
    assert 2500 / (math.pi * r * r) == pytest.approx(GLANCE * math.hypot(4, 20) / r / 1.5, rel=1e-9)


def test_viewing_all_day() -> None:
    """1064 nm, 3e4 s: small spots 10 C_A C_C = 50 W/m2 (ICNIRP 2013, from memory); from 0.1 m on."""
    faint = math.pi * 0.1**2 * 50
    for power, safe in ((0.99 * faint, True), (1.01 * faint, False)):
        result = run(power, spot_mm=0.01, wavelength=1064, exposure=1e-3)
        assert result.diffuse is not None
        assert result.diffuse.safe_all_day is safe
        assert result.diffuse.day_hazard_ratio == pytest.approx(power / faint, rel=1e-9)


def test_binoculars_collect_more_and_enlarge_the_spot() -> None:
    """7 x 50: 49 times the power, C_E 7 times larger, so 7 times the ratio (7 mm pupil, common practice)."""
    aid = {"objective_mm": 50, "magnification": 7}
    result = run(1e4, spot_mm=10, viewing={"aid": aid, "distance_m": 2})
    assert result.eye_aided is not None
    bare, aided = result.eye.at_distance, result.eye_aided.at_distance
    assert bare is not None
    assert aided is not None
    assert aided.hazard_ratio == pytest.approx(7 * bare.hazard_ratio, rel=1e-9)


def test_distances_of_interest_use_the_limit_that_holds_there() -> None:
    over = {"from_m": 0.2, "to_m": 5, "points": 7}
    result = run(2e4, spot_mm=20, viewing={"over_distance": over, "distance_m": 5})
    assert result.over_distance is not None
    places, first = result.over_distance.distance_m, result.over_distance.eye.criteria[0]
    for z, limit, ratio in zip(places, first.limit_j_m2, first.hazard_ratio, strict=True):
        alpha = max(1.5, 20 / z)
        assert limit == pytest.approx(18 * QUARTER**0.75 * alpha / 1.5, rel=1e-9)
        assert ratio * limit == pytest.approx(2e4 * QUARTER / (math.pi * z * z), rel=1e-6)
    assert result.eye.at_distance is not None
    assert result.eye.at_distance.hazard_ratio == result.over_distance.eye.hazard_ratio[-1]


def test_skin_knows_no_angle() -> None:
    """Skin, 5 s at 1064 nm: 11000 C_A t^0.25 J/m2 with C_A = 5 (ICNIRP 2013, from memory)."""
    limit = 11000 * 5 * 5**0.25 / 5
    result = run(1e6, spot_mm=100, wavelength=1064, exposure=5)
    assert result.skin.hazard_distance_m == pytest.approx(math.sqrt(1e6 / math.pi / limit), rel=1e-5)


def test_nothing_stands_behind_a_diffuser() -> None:
    body = {"lines": [], "bench": [{"element": "diffuser"}, {"element": "space", "length_m": 1}]}
    with pytest.raises(ValueError, match="diffuser must be the last element"):
        EvaluationRequest.model_validate(body)


EMISSIONS = st.sampled_from(
    [
        {"mode": "cw", "power_w": 1.0},
        {"mode": "pulse", "energy_j": 0.1, "pulse_s": 1e-8},
        {"mode": "train", "energy_j": 0.01, "pulse_s": 1e-8, "rate_hz": 20.0},
        {"mode": "train", "energy_j": 1e-3, "pulse_s": 1e-4, "rate_hz": 500.0},
    ]
)


@EXAMPLES
@given(
    EMISSIONS,
    st.sampled_from([355.0, 450.0, 532.0, 1064.0, 1320.0, 10600.0]),
    st.floats(0.1, 300),
    st.floats(1.01, 1e4),
    st.sampled_from(["icnirp-2013", "eu-2006-25", "iec-60825-1-2014", "ansi-z136-1-2014"]),
    st.sampled_from([0.25, 10.0, 3e4]),
)
def test_more_power_never_reaches_less_far(
    emission: dict[str, Any], wavelength: float, spot: float, more: float, rules: str, exposure: float
) -> None:
    """Nor is any place beyond the distance unsafe."""
    stronger = {k: v * more if k in ("power_w", "energy_j") else v for k, v in emission.items()}
    far = []
    for e in (emission, stronger):
        result = run(
            spot_mm=spot, wavelength=wavelength, rules=rules, exposure=exposure, line={"emission": e}
        )
        far.append(distance(result))
        assert math.isfinite(result.eye.hazard_ratio)
        beyond = max(far[-1], 0.1) * 1.0001
        over = {"from_m": beyond, "to_m": beyond * 1000, "points": 60}
        again = run(
            spot_mm=spot,
            wavelength=wavelength,
            rules=rules,
            exposure=exposure,
            line={"emission": e},
            viewing={"over_distance": over},
        )
        assert again.over_distance is not None
        assert max(again.over_distance.eye.hazard_ratio) <= 1.0 + 1e-9
    assert far[1] >= far[0] * (1 - 1e-9)


@pytest.mark.parametrize("distance_m", [0.0, 1e-6, 0.05])
def test_nearer_than_an_eye_can_focus(distance_m: float) -> None:
    """Nearer than 100 mm the spot counts as wide as from there: C_E = (d / 100 mm) / 1.5 mrad, 1 mm spot.
    At the spot itself all that is scattered counts as if it entered the pupil."""
    result = run(power=1.0, spot_mm=1.0, viewing={"distance_m": distance_m})
    at = result.eye.at_distance
    assert at is not None
    d = 2 * max(distance_m, 1e-9)
    inside = min(1.0, (7e-3 / d) ** 2)
    c_e = 1.0 / 0.1 / 1.5
    assert at.hazard_ratio == pytest.approx(inside / (math.pi / 4 * 7e-3**2) / (GLANCE * c_e), rel=1e-6)


def test_optics_load_eyewear_at_the_viewing_distance_too() -> None:
    """The aid narrows the scattered light M times: M^2 is the most by which it loads a filter, 7 x 7 = 49, so
    that the scale number rises by at most 2 and at least 1 (a decade and a half), as at the nearest place."""
    pair = [{"name": "Pair", "ranges": [{"from_nm": 500, "to_nm": 560, "marking": "D LB1"}]}]
    aid = {"objective_mm": 50, "magnification": 7}

    def marks_needed(viewing: dict[str, Any]) -> int:
        body = {
            "exposure_s": QUARTER,
            "lines": [
                {
                    "wavelength_nm": 532,
                    "emission": {"mode": "cw", "power_w": 1e4},
                    "beam": {"diameter_mm": 5, "divergence_mrad": 0, "level": "1/e"},
                }
            ],
            "bench": [{"element": "diffuser"}],
            "viewing": viewing,
            "eyewear": pair,
        }
        found = answer(EvaluationRequest.model_validate(body)).protection
        for number in range(1, 11):
            pair[0]["ranges"][0]["marking"] = f"D LB{number}"  # type: ignore[index]
            body["eyewear"] = pair
            found = answer(EvaluationRequest.model_validate(body)).protection
            if found.eyewear[0].sufficient_at_distance:
                return number
        raise AssertionError(found)

    bare, aided = marks_needed({"distance_m": 1.0}), marks_needed({"distance_m": 1.0, "aid": aid})
    assert bare + 1 <= aided <= bare + 2
