"""Beams: the share inside an aperture, beam diameters, irradiance and energy."""

from __future__ import annotations

import math

import numpy as np
import pytest

from service.optics.beams import SQRT2
from service.optics.encircled import encircled_fraction, round_diameter
from tests.published.cases import Case, check, pinned
from tests.published.product import IEC, beams, cw, evaluate

#: Radius w at 1/e2 of the beam that the shares are asked for; any will do.
W = 1.7e-3


def share(aperture_m: float, diameter_1e_m: float) -> float:
    """Share of a round Gaussian beam inside a centred round aperture."""
    d = np.array([diameter_1e_m])
    return float(encircled_fraction(np.array([aperture_m]), d, d, np.array([False]))[0])


#: Aperture diameter in units of the 1/e2 radius w.
APERTURES = {"G-PI-W": math.pi, "G-3W": 3.0, "G-W": 2.0}


@pinned(*APERTURES)
def test_share_of_a_gaussian_beam(case: Case) -> None:
    check(case, share(APERTURES[case.id] * W, 2 * W / SQRT2))


@pinned("G-63")
def test_share_inside_d63(case: Case) -> None:
    check(case, share(W, W))


@pinned("G-SQRT2")
def test_ratio_of_diameters(case: Case) -> None:
    """The aperture that takes 1 - exp(-2) is the 1/e2 diameter; the product inverts it to the 1/e one."""
    within_1e2 = np.array([1 - math.exp(-2)])
    diameter_1e = float(round_diameter(np.array([2 * W]), within_1e2, np.array([False]))[0])
    check(case, 2 * W / diameter_1e)
    check(case, SQRT2)
    # The contract's two levels: a beam of 8.00 mm at 1/e2 is one of 8.00 / 1.4142 = 5.657 mm at 1/e.
    wide = evaluate(IEC, 532, cw(), 0.25, diameter_mm=8.0, divergence_mrad=2.0, level="1/e2")
    same = evaluate(IEC, 532, cw(), 0.25, diameter_mm=5.657, divergence_mrad=1.4142, level="1/e")
    assert wide.eye.hazard_ratio == pytest.approx(same.eye.hazard_ratio, rel=1e-4)


@pinned("FIB-1550-1M")
def test_fibre_far_field(case: Case) -> None:
    """10 mW over the share of a single-mode far field through 3.5 mm at 100 mm.

    1/e2 full angle of a Gaussian waist of the mode-field diameter: 4 lambda / (pi MFD). The 10 mW are the
    rounded class limit (1000 W/m2 x 9.62 mm2 = 9.6 mW), a given of the case.
    """
    mode_field = case.inputs["mode_field_diameter_um"] * 1e-6
    angle = 4 * case.inputs["wavelength_nm"] * 1e-9 / (math.pi * mode_field)
    fibre = beams(mode_field / SQRT2, angle / SQRT2)
    place = np.array([case.inputs["distance_mm"] * 1e-3])
    inside = fibre.fraction(np.array([case.inputs["aperture_mm"] * 1e-3]), place)[0]
    check(case, case.inputs["AEL_mW"] * 1e-3 / inside)


@pinned("UNI-IRR", "IEC-SURVEY")
def test_irradiance_of_a_flat_beam(case: Case) -> None:
    """Both beams are wider than the 7 mm aperture, so the exposure is the beam's own irradiance."""
    exposure = 0.25
    width, power = case.inputs["beam_diameter_mm"], case.inputs["power_W"]
    result = evaluate(IEC, 632.8, cw(power), exposure, profile="tophat", diameter_mm=width)
    check(case, result.eye.criteria[0].exposure_j_m2 / exposure)
    if case.id == "IEC-SURVEY":  # the example concludes: below 25.4 W/m2, so safe for 0.25 s
        assert result.eye.hazard_ratio < 1.0
        assert result.eye.hazard_distance_m == 0.0


@pinned("RAD-651-E")
def test_irradiance_over_the_pupil(case: Case) -> None:
    """2 mW / 38.48 mm2 = 51.97 W/m2, 0.005197 W/cm2; the message cuts it to 0.00519, one unit allowed."""
    exposure = 0.25
    result = evaluate(IEC, case.inputs["wavelength_nm"], cw(case.inputs["power_W"]), exposure)
    (row,) = result.eye.criteria
    assert row.aperture_mm == case.inputs["aperture_mm"]
    check(case, row.exposure_j_m2 / exposure, 1e-5)


@pinned("TX-Q")
def test_energy_in_the_blink_time(case: Case) -> None:
    """The whole 2 mm spot enters the 7 mm pupil: exposure times aperture area is the energy, P t."""
    exposure = case.inputs["exposure_s"]
    result = evaluate(IEC, 632.8, cw(case.inputs["power_W"]), exposure, profile="tophat", diameter_mm=2.0)
    (row,) = result.eye.criteria
    check(case, row.exposure_j_m2 * math.pi / 4 * (row.aperture_mm * 1e-3) ** 2)


@pinned("TX-LASIK-I")
def test_irradiance_in_a_focused_spot(case: Case) -> None:
    """Through any aperture narrower than the spot, the mean irradiance of a flat spot."""
    spot = beams(case.inputs["beam_diameter_mm"] * 1e-3, 1e-3, tophat=True)
    aperture = 1e-4
    inside = spot.fraction(np.array([aperture]), np.zeros(1))[0]
    check(case, case.inputs["power_W"] * inside / (math.pi / 4 * aperture**2))
