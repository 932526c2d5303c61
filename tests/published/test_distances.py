"""Distances at which the irradiance of a beam falls to a limit.

The textbooks spread a beam linearly, d(z) = a + phi z, and take its peak irradiance 4 P / (pi d^2), d at 1/e.
The product spreads it by second moments, d(z)^2 = a^2 + (phi z)^2, and averages over the aperture. Both reach
the same diameter; from there z differs by less than a / phi (at most 70 m in 7 km, for a 7 mm beam of
0.1 mrad), and both agree at printed precision. Averaging over 7 mm in a beam of 80 mm takes 0.2 % off the
distance, so levels that are peak irradiances are asked with a point for an aperture. No loss in air.
"""

from __future__ import annotations

from tests.published.cases import Case, check, pinned
from tests.published.product import ANSI, cw, evaluate, reach_m

#: Exit diameter [m] where the formula has none, and aperture where it takes the peak irradiance: it changes
#: the distances by less than 1e-5 of themselves.
POINT_M = 1e-4


@pinned("AVI-6W-NOHD")
def test_hazard_distance_by_the_products_own_limit(case: Case) -> None:
    """0.25 s, 25.5 W/m2. The article also prints 488 m, which is 1600 ft converted."""
    result = evaluate(
        ANSI,
        case.inputs["wavelength_nm"],
        cw(case.inputs["power_W"]),
        0.25,
        divergence_mrad=case.inputs["divergence_mrad"],
    )
    check(case, result.eye.hazard_distance_m)


@pinned("OSHA-CO2-8h-lens-on-laser")
def test_behind_a_lens_by_the_products_own_limit(case: Case) -> None:
    """0.1 W/cm2 at 10.6 um; the distance counts from the focus, where the beam opens with b / f."""
    opening = case.inputs["beam_at_lens_mm"] / case.inputs["focal_length_mm"]
    result = evaluate(
        ANSI, case.inputs["wavelength_nm"], cw(case.inputs["power_W"]), 3e4, divergence_mrad=opening * 1e3
    )
    assert result.eye.criteria[result.eye.governing].limit_w_m2 == case.inputs["MPE_W_cm2"] * 1e4
    check(case, result.eye.hazard_distance_m)


@pinned("OSHA-AR-8h-lens-on-laser")
def test_behind_a_lens_to_a_stated_limit(case: Case) -> None:
    """As above, with the limit of 1986, 1 uW/cm2, that no rule set has any more."""
    opening = case.inputs["beam_at_lens_mm"] / case.inputs["focal_length_mm"]
    check(case, reach_m(case.inputs["power_W"], case.inputs["MPE_W_cm2"] * 1e4, POINT_M, opening))


@pinned("AVI-6W-DIST", "AVI-5mW-FLASH", "AVI-5mW-GLARE")
def test_to_a_visual_level(case: Case) -> None:
    """50 nW/cm2 (distraction), 100 uW/cm2 (flash-blindness), 5 uW/cm2 (glare), as the case states them.

    sqrt(4 x 6 W / (pi x 5e-4 W/m2)) / 1.1 mrad = 112.37 km = 368 670 ft, by hand; the article cuts this to
    368 000 ft, so one unit in its last digit is allowed there.
    """
    tolerance = 1000.0 if case.id == "AVI-6W-DIST" else None
    level, angle = case.inputs["irradiance_W_m2"], case.inputs["divergence_mrad"] * 1e-3
    check(case, reach_m(case.inputs["power_W"], level, POINT_M, angle, POINT_M), tolerance)


@pinned("IEC-NOHD-4W", "IEC-NOHD-4W-X", "OSHA-YAG-8h-direct")
def test_to_a_stated_limit(case: Case) -> None:
    """10 W/m2, and 1.6 mW/cm2 of 1986; by hand (linear spread) 1018 m, 7066 m and 1409.5 m."""
    stated = case.inputs.get("MPE_W_m2", 1e4 * case.inputs.get("MPE_W_cm2", 0.0))
    width, angle = case.inputs["beam_diameter_mm"] * 1e-3, case.inputs["divergence_mrad"] * 1e-3
    check(case, reach_m(case.inputs["power_W"], stated, width, angle))


#: Limit of the product [W/m2] and exposure [s] for each printed diffuse distance.
DIFFUSE = {
    "OSHA-YAG-10s-diffuse": (50.0, 10.0),
    "OSHA-CO2-8h-diffuse": (1000.0, 3e4),
    "OSHA-AR-0.25s-diffuse": (18 * 0.25**-0.25, 0.25),
}


@pinned(*DIFFUSE)
def test_off_a_diffuse_surface(case: Case) -> None:
    """The stated limit of the old edition only scales the power, so that the geometry alone is compared."""
    allowed, exposure = DIFFUSE[case.id]
    power = case.inputs["power_W"] * allowed / (case.inputs["MPE_W_cm2"] * 1e4)
    result = evaluate(
        ANSI,
        case.inputs["wavelength_nm"],
        cw(power),
        exposure,
        bench=[{"element": "diffuser", "reflectance": case.inputs["reflectance"]}],
    )
    check(case, result.eye.hazard_distance_m)
