"""Bench elements against textbook closed forms and matrices multiplied by hand."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.optics.air import extinction_per_m
from service.optics.beams import Beams
from service.optics.elements import expander, fresnel, lens, mirror, plate, space, through

EXAMPLES = settings(max_examples=200, deadline=None, derandomize=True)


def beam(d: float = 2e-3, phi: float = 1e-3, waist: float = 0.0) -> Beams:
    values = (d, d, phi, phi, waist)
    return Beams.with_waist(np.array([False]), *(np.array([v]) for v in values))


def figures(b: Beams) -> list[float]:
    return [float(x[0]) for axis in b.axes() for x in axis]


def test_lens_makes_the_textbook_waist() -> None:
    """Siegman, Lasers (1986), ch. 17 (from memory): a collimated beam of waist w0 and Rayleigh range zR at a
    thin lens focuses at f / (1 + (f/zR)^2) with w = w0 (f/zR) / sqrt(1 + (f/zR)^2)."""
    d, phi, f = 4e-3, 0.5e-3, 0.25
    rayleigh = d / phi
    x = f / rayleigh
    (d1, phi1, z1), _ = through(beam(d, phi), lens(f)).axes()
    assert z1[0] == pytest.approx(f / (1 + x * x), rel=1e-12)
    assert d1[0] == pytest.approx(d * x / math.sqrt(1 + x * x), rel=1e-12)
    assert d1[0] * phi1[0] == pytest.approx(d * phi, rel=1e-12)


def test_gaussian_through_lens_by_the_complex_beam_parameter() -> None:
    """Independent: q' = (a q + b) / (c q + d) with 1/q = 1/R - i lambda / (pi w^2) (textbook)."""
    wavelength, w0, z0, f, after = 1064e-9, 0.4e-3, -0.7, 0.1, 0.3
    half = wavelength / (math.pi * w0)
    start = beam(2 * w0 / math.sqrt(2), 2 * half / math.sqrt(2), z0)
    q = complex(-z0, math.pi * w0**2 / wavelength)
    q = q / (-q / f + 1) + after
    w = math.sqrt(-wavelength / (math.pi * (1 / q).imag))
    found = through(through(start, lens(f)), space(after))
    x, _ = found.diameters_m(np.array([0.0]))
    assert x[0] == pytest.approx(2 * w / math.sqrt(2), rel=1e-9)


def test_expander_and_mirror_by_hand() -> None:
    """Expander: diameter x M, angle / M. Mirror R at 60 degrees: f = R cos/2 = R/4 and R/(2 cos) = R."""
    (d, phi, _), _ = through(beam(), expander(5.0)).axes()
    assert (d[0], phi[0]) == (pytest.approx(10e-3), pytest.approx(0.2e-3))
    mixed = through(beam(), mirror(1.0, math.radians(60)))
    assert figures(mixed)[:3] == pytest.approx(figures(through(beam(), lens(0.25)))[:3], rel=1e-12)
    assert figures(mixed)[3:] == pytest.approx(figures(through(beam(), lens(1.0)))[3:], rel=1e-12)


def test_nothing_changes_nothing() -> None:
    """Space of no length, a lens of infinite focal length, a flat mirror, an expander of 1."""
    start = beam(waist=-0.3)
    for matrices in (space(0.0), lens(1e300), mirror(1e300, 0.0), expander(1.0)):
        assert figures(through(start, matrices)) == pytest.approx(figures(start), rel=1e-9, abs=1e-15)


@EXAMPLES
@given(
    st.floats(1e-5, 1e-1),
    st.floats(1e-5, 0.3),
    st.floats(-10, 10),
    st.floats(-5, 5).filter(lambda f: abs(f) > 1e-2),
)
def test_lens_and_its_opposite_restore_the_beam(d: float, phi: float, waist: float, f: float) -> None:
    start = beam(d, phi, waist)
    back = through(through(start, lens(f)), lens(-f))
    x0, _ = start.diameters_m(np.array([1.0]))
    x1, _ = back.diameters_m(np.array([1.0]))
    assert x1[0] == pytest.approx(x0[0], rel=1e-6)


def test_fresnel_textbook_values() -> None:
    """Glass of index 1.5: 4 % at normal incidence, nothing for p at the Brewster angle, all at grazing."""
    for polarisation in ("s", "p", "unpolarised"):
        assert fresnel(1.5, 0.0, polarisation) == pytest.approx(0.04, rel=1e-12)
        assert fresnel(1.5, math.pi / 2, polarisation) == pytest.approx(1.0, rel=1e-6)
    brewster = math.atan(1.5)
    assert fresnel(1.5, brewster, "p") == pytest.approx(0.0, abs=1e-30)
    # At the Brewster angle R_s = ((n^2 - 1) / (n^2 + 1))^2 = (1.25 / 3.25)^2
    assert fresnel(1.5, brewster, "s") == pytest.approx((1.25 / 3.25) ** 2, rel=1e-12)
    assert fresnel(4.0, 0.0, "s") == pytest.approx(0.36, rel=1e-12)  # germanium: (3/5)^2
    assert plate(0.04) == pytest.approx(0.08 / 1.04, rel=1e-12)


def test_air_by_hand() -> None:
    """Koschmieder: 3.912 / V at 550 nm; Kruse exponent 1.3 at 23 km, 1.6 at 60 km, 0.585 cbrt(V) at 1 km."""
    one = extinction_per_m(np.array([1e4]), np.array([550.0]))
    assert one[0] == pytest.approx(3.912e-4, rel=1e-12)
    for km, q in ((23.0, 1.3), (60.0, 1.6), (1.0, 0.585)):
        value = extinction_per_m(np.array([km * 1e3]), np.array([1100.0]))
        assert value[0] == pytest.approx(3.912 / (km * 1e3) * 2.0**-q, rel=1e-12)
    # Not more loss is claimed below 550 nm than at 550 nm (the safe side).
    assert extinction_per_m(np.array([1e4]), np.array([400.0]))[0] == one[0]
