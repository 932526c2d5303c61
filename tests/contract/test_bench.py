"""The bench in the answer: published distances, nothing that changes nothing, random chains."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.contract.answer import answer
from service.contract.evaluation import EvaluationResult
from service.contract.request import EvaluationRequest
from tests.assess.strategies import line, log

EXAMPLES = settings(max_examples=120, deadline=None, derandomize=True)


def run(
    bench: list[dict[str, Any]] | None = None,
    viewing: dict[str, Any] | None = None,
    *,
    wavelength: float = 532,
    power: float = 1.0,
    exposure: float = 0.25,
    beam: dict[str, Any] | None = None,
    **more: Any,
) -> EvaluationResult:
    one = {
        "wavelength_nm": wavelength,
        "emission": {"mode": "cw", "power_w": power},
        "beam": beam or {"diameter_mm": 3.0, "divergence_mrad": 1.0},
        **more,
    }
    body = {"exposure_s": exposure, "lines": [one], "bench": bench or [], "viewing": viewing or {}}
    return answer(EvaluationRequest.model_validate(body))


def test_lens_on_laser_as_published() -> None:
    """OSHA Technical Manual III 6 (from memory): CO2 500 W, f = 200 mm, 30 mm at the lens, limit 0.1 W/cm2
    (1000 W/m2 from 10 s on): 5.3 m = (f/b) sqrt(4P/(pi E)), counted from the focus."""
    beam = {"diameter_mm": 30, "divergence_mrad": 0.1, "level": "1/e"}
    result = run([{"element": "lens", "focal_mm": 200}], wavelength=10600, power=500, exposure=10, beam=beam)
    assert result.eye.hazard_distance_m is not None
    assert result.eye.hazard_distance_m - 0.2 == pytest.approx(5.3, abs=0.05)
    assert result.eye.worst_place_m == pytest.approx(0.2, rel=1e-3)


def test_multimode_fibre_closed_form() -> None:
    """NOHD = (1.7 / NA) sqrt(P / (pi E)) (textbook, IEC 60825-2 practice, from memory); limit 10 C_A W/m2,
    850 nm, 100 s. The closed form takes the peak, the answer the mean over 7 mm: together within 1 %."""
    beam = {"profile": "fibre_multimode", "numerical_aperture": 0.2, "core_diameter_um": 50}
    result = run(wavelength=850, power=0.1, exposure=100, beam=beam)
    limit = 10 * 10 ** (0.002 * 150)
    expected = 1.7 / 0.2 * math.sqrt(0.1 / (math.pi * limit))
    assert result.eye.hazard_distance_m == pytest.approx(expected, rel=0.01)


def test_single_mode_fibre_as_published() -> None:
    """FIB-1550-1M (read): 136 mW out of an 11 um fibre sends 10 mW through 3.5 mm at 100 mm."""
    beam = {"profile": "fibre_single_mode", "mode_field_diameter_um": 11}
    result = run(viewing={"distance_m": 0.1}, wavelength=1550, power=0.1364, exposure=10, beam=beam)
    at = result.eye.at_distance
    assert at is not None
    through = at.hazard_ratio * 1000 * math.pi / 4 * 3.5e-3**2
    assert through == pytest.approx(10e-3, rel=5e-3)


def test_collimated_fibre() -> None:
    """A lens at its focal length behind the fibre end: divergence = MFD / f (textbook)."""
    beam = {"profile": "fibre_single_mode", "mode_field_diameter_um": 10}
    bench = [{"element": "space", "length_m": 0.1}, {"element": "lens", "focal_mm": 100}]
    far = run(bench, wavelength=1064, power=1.0, exposure=10, beam=beam).eye.hazard_distance_m
    assert far is not None
    # 1/e diameter at z: (10 um / 100 mm) z / sqrt 2; the ratio falls to 1 where it equals sqrt(4P/(pi E)).
    wanted = math.sqrt(4 * 1.0 / (math.pi * 50.0))
    assert far == pytest.approx(wanted * math.sqrt(2) / 1e-4, rel=5e-3)


NOTHING: list[dict[str, Any]] = [
    {"element": "space", "length_m": 0},
    {"element": "lens", "focal_mm": 1e9},
    {"element": "window", "transmittance": 1},
    {"element": "reflector", "reflectance": 1},
    {"element": "mirror", "radius_mm": -1e9},
    {"element": "expander", "magnification": 1},
]


@pytest.mark.parametrize("element", NOTHING, ids=lambda e: e["element"])
def test_elements_that_change_nothing(element: dict[str, Any]) -> None:
    plain, same = run(), run([element])
    for a, b in ((plain.eye, same.eye), (plain.skin, same.skin)):
        assert b.hazard_ratio == pytest.approx(a.hazard_ratio, rel=1e-9)
        assert b.hazard_distance_m == pytest.approx(a.hazard_distance_m, rel=1e-5)


def test_reflection_and_window_scale_the_ratio() -> None:
    """Glass of index 1.5 reflects 4 %; a plate 2 x 0.04 / 1.04; density 2 lets 1 % through."""
    whole = run().eye.hazard_ratio
    glass = {"element": "reflector", "refractive_index": 1.5}
    assert run([glass]).eye.hazard_ratio == pytest.approx(0.04 * whole, rel=1e-9)
    assert run([{**glass, "surfaces": 2}]).eye.hazard_ratio == pytest.approx(0.08 / 1.04 * whole, rel=1e-9)
    filtered = run([{"element": "window", "transmittance": 0.01}]).eye.hazard_ratio
    assert filtered == pytest.approx(0.01 * whole, rel=1e-12)


def test_materials_by_wavelength() -> None:
    """From memory: crown glass 1.517 at 589 nm, ((n-1)/(n+1))^2; gold reflects 75 % green, 99 % infrared."""
    whole = run().eye.hazard_ratio
    glass = run([{"element": "reflector", "material": "crown glass"}]).eye.hazard_ratio
    assert glass == pytest.approx((0.517 / 2.517) ** 2 * whole, rel=1e-9)
    gold = [{"element": "reflector", "material": "gold"}]
    assert run(gold).eye.hazard_ratio == pytest.approx(0.75 * whole, rel=1e-9)
    infrared = run(wavelength=1064).eye.hazard_ratio
    assert run(gold, wavelength=1064).eye.hazard_ratio == pytest.approx(0.99 * infrared, rel=1e-9)


def test_external_focus_has_a_zone_of_its_own() -> None:
    """A wide faint beam, safe at the lens: a zone around the focus, symmetric for a round beam."""
    beam = {"diameter_mm": 60, "divergence_mrad": 0.5}
    result = run([{"element": "lens", "focal_mm": 2000}], power=0.02, beam=beam)
    zone = result.eye.hazard_zone_m
    assert zone is not None
    near, far = zone
    assert far is not None
    assert near > 0.5
    assert near + far == pytest.approx(2 * result.eye.worst_place_m, rel=1e-9)
    assert any(n.code == "external-focus" for n in result.notices)


def test_mirror_at_an_angle_has_two_foci() -> None:
    """R = 200 mm at 60 degrees: f = 50 mm and 200 mm. The worst place lies between, found by a fine scan."""
    beam = {"diameter_mm": 20, "divergence_mrad": 0.5}
    bench = [{"element": "mirror", "radius_mm": 200, "incidence_deg": 60}]
    viewing = {"over_distance": {"from_m": 0.03, "to_m": 0.5, "points": 1000}}
    result = run(bench, viewing, power=0.003, beam=beam)
    assert result.over_distance is not None
    places, ratios = (
        np.array(result.over_distance.distance_m),
        np.array(result.over_distance.eye.hazard_ratio),
    )
    assert result.eye.hazard_ratio == pytest.approx(ratios.max(), rel=1e-3)
    assert result.eye.hazard_ratio >= ratios.max()
    over = places[ratios > 1]
    zone = result.eye.hazard_zone_m
    assert zone is not None
    assert zone[1] == pytest.approx(over[-1], rel=5e-3)


def test_binoculars_collect_more() -> None:
    """7 x 50 against the unaided 7 mm: the gain in collected power is (min(50, 49) / 7)^2 = 49 far away."""
    result = run(viewing={"aid": {"objective_mm": 50, "magnification": 7}, "distance_m": 1e5}, power=100)
    assert result.eye_aided is not None
    assert result.eye_aided.at_distance is not None
    assert result.eye.at_distance is not None
    gain = result.eye_aided.at_distance.hazard_ratio / result.eye.at_distance.hazard_ratio
    assert gain == pytest.approx(49.0, rel=1e-3)
    assert result.eye_aided.hazard_distance_m > result.eye.hazard_distance_m  # type: ignore[operator]
    # Beyond 4000 nm optics do not pass the beam: nothing changes.
    far = run(viewing={"aid": {"objective_mm": 50, "magnification": 7}}, wavelength=10600)
    assert far.eye_aided is not None
    assert far.eye_aided.hazard_distance_m == far.eye.hazard_distance_m


def test_aid_enlarges_the_source() -> None:
    """alpha 2 mrad seen 7 times larger: C_E 14/1.5 instead of 2/1.5, so the aided limit is 7 times wider."""
    result = run(viewing={"aid": {"objective_mm": 50, "magnification": 7}}, subtense_mrad=2.0)
    assert result.eye_aided is not None
    aided, bare = result.eye_aided.criteria[0].limit_j_m2, result.eye.criteria[0].limit_j_m2
    assert aided == pytest.approx(7 * bare, rel=1e-12)


def test_haze_shortens_by_the_exponential() -> None:
    """At the hazy distance the clear-air ratio times exp(-mu z) is 1; mu = 3.912 / 5 km at 550 nm."""
    beam = {"diameter_mm": 3, "divergence_mrad": 0.1}
    hazy = run(viewing={"visibility_km": 5}, wavelength=550, power=10, beam=beam)
    z = hazy.eye.hazard_distance_m
    assert z is not None
    clear = run(viewing={"distance_m": z}, wavelength=550, power=10, beam=beam)
    assert clear.eye.at_distance is not None
    assert clear.eye.at_distance.hazard_ratio * math.exp(-3.912 / 5e3 * z) == pytest.approx(1.0, rel=1e-9)
    assert z < clear.eye.hazard_distance_m  # type: ignore[operator]


def test_open_resonator_is_a_hundred_times_the_output() -> None:
    """A mirror of 99 % lets out a hundredth (common practice, no source)."""
    assert run(output_mirror_reflectance=0.99).eye.hazard_ratio == pytest.approx(
        100 * run().eye.hazard_ratio, rel=1e-9
    )


def test_class_is_that_of_the_laser_without_the_bench() -> None:
    """A filter on the bench does not change the class of the laser."""
    filtered = run([{"element": "window", "transmittance": 1e-6}])
    assert filtered.classification[0].hazard_class == run().classification[0].hazard_class == "4"


@st.composite
def element(draw: st.DrawFn) -> dict[str, Any]:
    kind = draw(st.sampled_from(["space", "lens", "mirror", "expander", "window", "reflector"]))
    if kind == "space":
        return {"element": kind, "length_m": draw(log(1e-3, 100))}
    if kind == "lens":
        return {"element": kind, "focal_mm": draw(log(1, 1e4)) * draw(st.sampled_from([1, -1]))}
    if kind == "mirror":
        sign = draw(st.sampled_from([1, -1]))
        angle = draw(st.floats(0, 80))
        return {"element": kind, "radius_mm": draw(log(1, 1e4)) * sign, "incidence_deg": angle}
    if kind == "expander":
        return {"element": kind, "magnification": draw(log(0.1, 10))}
    if kind == "window":
        return {"element": kind, "transmittance": draw(log(1e-6, 1))}
    return {
        "element": kind,
        "refractive_index": draw(st.floats(1, 4)),
        "incidence_deg": draw(st.floats(0, 90)),
    }


@EXAMPLES
@given(st.lists(line(), min_size=1, max_size=2), st.lists(element(), max_size=6), log(1e-4, 1.0))
def test_random_chains(lines: list[dict[str, Any]], bench: list[dict[str, Any]], passed: float) -> None:
    """Never a failure or a NaN; more attenuation never lengthens a distance or raises a density."""
    body = {"lines": lines, "bench": bench}
    open_ = answer(EvaluationRequest.model_validate(body))
    filtered = {**body, "bench": [*bench, {"element": "window", "transmittance": passed}]}
    less = answer(EvaluationRequest.model_validate(filtered))
    for a, b in ((open_.eye, less.eye), (open_.skin, less.skin)):
        for x in (a.hazard_ratio, b.hazard_ratio, a.optical_density, a.worst_place_m):
            assert math.isfinite(x)
        assert b.hazard_ratio <= a.hazard_ratio * (1 + 1e-9)
        far = math.inf if a.hazard_distance_m is None else a.hazard_distance_m
        nearer = math.inf if b.hazard_distance_m is None else b.hazard_distance_m
        assert nearer <= far * (1 + 1e-6) + 1e-9
