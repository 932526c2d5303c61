"""Sweeping beams against integrals taken independently."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import integrate

from service.optics.beams import Beams
from service.optics.sweep import Scan, mean_chord_m, passes


def chord(a: float, d: float, tophat: bool = False) -> float:
    return float(mean_chord_m(np.array([a]), np.array([d]), np.array([tophat]))[0])


@pytest.mark.parametrize(
    ("a", "d"), [(7.0, 1.0), (7.0, 5.0), (7.0, 7.0), (7.0, 30.0), (3.5, 100.0), (1.0, 9.0)]
)
def test_gaussian_chord_by_quadrature(a: float, d: float) -> None:
    """Independent: the integral of 2 sqrt(a^2/4 - y^2) 2/(sqrt(pi) d) exp(-4 y^2/d^2) over y."""
    value, _ = integrate.quad(
        lambda y: (
            2 * math.sqrt(a * a / 4 - y * y) * 2 / (math.sqrt(math.pi) * d) * math.exp(-4 * y * y / d**2)
        ),
        -a / 2,
        a / 2,
        epsabs=0,
        epsrel=1e-10,
    )
    assert chord(a, d) == pytest.approx(value, rel=1e-6)


@pytest.mark.parametrize(("a", "d"), [(7.0, 1.0), (7.0, 7.0), (7.0, 30.0), (1.0, 9.0)])
def test_uniform_chord_by_quadrature(a: float, d: float) -> None:
    end = min(a, d) / 2
    value, _ = integrate.quad(
        lambda y: 2 * math.sqrt(a * a / 4 - y * y) * 4 / (math.pi * d) * math.sqrt(1 - 4 * y * y / d**2),
        -end,
        end,
        epsabs=0,
        epsrel=1e-9,
    )
    assert chord(a, d, tophat=True) == pytest.approx(value, rel=1e-4)


def test_narrow_beam_crosses_the_whole_aperture() -> None:
    """A thin beam stays inside for the aperture's diameter (common practice, no source); never longer."""
    assert chord(7.0, 0.01) == 7.0
    assert 7.0 * 0.99 < chord(7.0, 0.9) <= 7.0


def beam(d: float, phi: float) -> Beams:
    columns = [np.array([v]) for v in (d, d, phi, phi, 0.0)]
    return Beams.with_waist(np.array([False]), *columns)


def at(scan: Scan, z: float, *, end: bool = False, d: float = 1e-4, phi: float = 1e-5) -> tuple[float, float]:
    duration, rate = passes(scan, beam(d, phi), np.array([7e-3]), np.array([z]), at_end=end)
    return float(duration[0]), float(rate[0])


def test_line_scan_by_hand() -> None:
    """0.5 rad swept 100 times a second moves at 50 rad/s: 7 mm at 10 m take 14 us, 100 times a second."""
    line = Scan(0.5, 100.0, False, 1, 0.0)
    assert at(line, 10.0) == (pytest.approx(14e-6, rel=1e-9), 100.0)
    assert at(line, 20.0)[0] == pytest.approx(7e-6, rel=1e-9)
    # At the turning point the beam comes half as often and passes twice in one.
    assert at(line, 10.0, end=True) == (pytest.approx(28e-6, rel=1e-9), 50.0)
    # At the scanner itself the beam never leaves the aperture.
    duration, rate = at(line, 0.0)
    assert duration * rate == 1.0


def test_swinging_mirror_is_fastest_in_the_middle() -> None:
    """x = (A/2) cos(2 pi f t): middle speed pi f A with f = 50 Hz, pi/2 times the mean; at the end the time
    within w of the turning point is arccos(1 - 2 w/A) / (pi f)."""
    swing = Scan(0.5, 100.0, True, 1, 0.0)
    assert at(swing, 10.0)[0] == pytest.approx(7e-4 / (math.pi * 50 * 0.5), rel=1e-9)
    within = math.acos(1 - 2 * 7e-4 / 0.5) / (math.pi * 50)
    assert at(swing, 10.0, end=True) == (pytest.approx(within, rel=1e-9), 50.0)


def test_raster_counts_the_rows_that_touch() -> None:
    """1000 rows over 0.5 rad at 10 m lie 5 mm apart: 7 mm meet at most (7 + beam) / 5 + 1 of them."""
    raster = Scan(0.5, 60_000.0, False, 1000, 0.5 * 0.999)
    _, rate = at(raster, 10.0)
    frames = 60.0
    assert frames * 2.0 <= rate <= frames * (7.2 / 5 + 1.0)
    # Close by every row is met.
    assert at(raster, 1e-3)[1] == pytest.approx(60_000.0)
