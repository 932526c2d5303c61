"""The fit recovers beams that were made by hand, within the uncertainty it states."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import curve_fit

from service.optics.beam_fit import BeamFit, NoBeam, fit_beam

GREEN = 532e-9
#: Waist 1 mm, 0.3 m behind the exit, 2 mrad; ISO 11146: M2 = pi theta d0 / (4 lambda).
WAIST, PLACE, ANGLE = 1e-3, 0.3, 2e-3
M2 = np.pi * ANGLE * WAIST / (4.0 * GREEN)
Z = np.array([-0.1, 0.1, 0.3, 0.5, 0.7, 1.4, 1.6, 1.9, 2.3, 2.8])
D = np.sqrt(WAIST**2 + (ANGLE * (Z - PLACE)) ** 2)


def true(fit: BeamFit) -> list[bool]:
    """Whether each stated interval holds the true figure."""
    return [
        abs(fit.waist_diameter_m - WAIST) <= fit.uncertainty_waist_diameter_m,
        abs(fit.waist_m - PLACE) <= fit.uncertainty_waist_m,
        abs(fit.divergence_rad - ANGLE) <= fit.uncertainty_divergence_rad,
        abs(fit.m2 - M2) <= fit.uncertainty_m2,
    ]


def test_exact_diameters_give_the_beam_exactly() -> None:
    fit = fit_beam(Z, D, None, 0.0, GREEN)
    found = (fit.waist_diameter_m, fit.waist_m, fit.divergence_rad, fit.m2)
    assert found == pytest.approx((WAIST, PLACE, ANGLE, M2), rel=1e-9)
    assert fit.rayleigh_m == pytest.approx(0.5, rel=1e-9)
    assert np.abs(fit.residuals_m).max() < 1e-12


@pytest.mark.parametrize("told", [True, False], ids=["uncertainties given", "from the scatter"])
def test_synthetic_beams_lie_within_the_stated_uncertainty(told: bool) -> None:
    """95 % intervals over 600 noisy beams: between 93.5 and 99 % hold the truth."""
    draw = np.random.default_rng(5)
    held = np.zeros(4)
    for _ in range(600):
        noisy = D * (1.0 + draw.normal(0.0, 0.01, len(Z)))
        held += true(fit_beam(Z, noisy, 0.02 * D if told else None, 0.0, GREEN))
    assert ((held / 600.0 > 0.935) & (held / 600.0 < 0.99)).all(), held / 600.0


def test_uncertainty_against_an_independent_fit() -> None:
    """Non-linear least squares of the diameters themselves (scipy), not of their squares."""
    noisy = D * (1.0 + np.random.default_rng(2).normal(0.0, 0.005, len(Z)))

    def beam(z: np.ndarray, d0: float, z0: float, angle: float) -> np.ndarray:
        return np.sqrt(d0**2 + (angle * (z - z0)) ** 2)

    best, covariance = curve_fit(beam, Z, noisy, (1e-3, 0.2, 1e-3), sigma=0.005 * D, absolute_sigma=True)
    fit = fit_beam(Z, noisy, 0.01 * D, 0.0, GREEN)
    assert (fit.waist_diameter_m, fit.waist_m, fit.divergence_rad) == pytest.approx(best, rel=2e-3)
    stated = (fit.uncertainty_waist_diameter_m, fit.uncertainty_waist_m, fit.uncertainty_divergence_rad)
    scatter = np.sqrt(max(1.0, float((((noisy - beam(Z, *best)) / (0.005 * D)) ** 2).sum()) / 7.0))
    assert stated == pytest.approx(2.0 * scatter * np.sqrt(np.diag(covariance)), rel=0.05)


def test_shared_scale_of_the_instrument_enters_in_full() -> None:
    """A camera 3 % off shifts diameter and divergence by 3 % and M2 by 6 %, the place not at all."""
    fit = fit_beam(Z, D, None, 0.03, GREEN)
    assert fit.uncertainty_waist_diameter_m == pytest.approx(0.03 * WAIST, rel=1e-6)
    assert fit.uncertainty_divergence_rad == pytest.approx(0.03 * ANGLE, rel=1e-6)
    assert fit.uncertainty_m2 == pytest.approx(0.06 * M2, rel=1e-6)
    assert fit.uncertainty_waist_m < 1e-9


@pytest.mark.parametrize(
    ("z", "d", "own", "words"),
    [
        ([0.0, 1.0, 1.0], [1e-3, 2e-3, 2e-3], None, "three distances"),
        ([0.0, 1.0, 2.0], [1e-3, 2e-3, 3.2e-3], None, "scatter open"),
        ([0.0, 1.0, 2.0, 3.0], [1e-3, 2e-3, 2.5e-3, 2.6e-3], None, "no divergence"),
        ([0.0, 0.1, 0.2, 0.3, 1e6], [1e-3, 1.1e-3, 1.3e-3, 1.5e-3, 3e-5], None, "unevenly|no divergence"),
        ([2.0, 3.0, 4.0, 5.0], [0.3873e-3, 1.4663e-3, 2.4799e-3, 3.4857e-3], None, "no waist"),
    ],
)
def test_what_is_no_beam_is_refused(z: list[float], d: list[float], own: None, words: str) -> None:
    with pytest.raises(NoBeam, match=words):
        fit_beam(np.array(z), np.array(d), own, 0.0, GREEN)
