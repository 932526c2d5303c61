"""Encircled fractions against quadrature of the beam's own definition."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest
from mpmath import mp
from scipy import integrate, special

from service.optics.encircled import encircled_fraction, round_diameter


def fraction(a: float, x: float, y: float, tophat: bool = False) -> float:
    return float(encircled_fraction(np.array([a]), np.array([x]), np.array([y]), np.array([tophat]))[0])


def by_strips(a: float, x: float, y: float) -> float:
    """Gaussian exp(-4x2/dx2 - 4y2/dy2) over a disc of diameter a: strips in x, erf along y (scipy)."""

    def strip(angle: float) -> float:
        u = 0.5 * a * math.sin(angle)
        chord = math.sqrt(max(0.0, 0.25 * a * a - u * u))
        density = 2.0 / (math.sqrt(math.pi) * x) * math.exp(-4.0 * u * u / x**2)
        return density * special.erf(2.0 * chord / y) * 0.5 * a * math.cos(angle)

    edges = {math.asin(min(1.0, k * x / a)) for k in (0.25, 0.5, 1.0, 2.0, 4.0)}
    points = sorted({0.0, math.pi / 2, *edges})
    parts = [integrate.quad(strip, p, q, epsabs=0, epsrel=1e-12, limit=200)[0] for p, q in pairwise(points)]
    return 2.0 * sum(parts)


@pytest.mark.parametrize("ratio", [1.0001, 1.5, 3.0, 10.0, 100.0, 1000.0])
@pytest.mark.parametrize("size", [0.01, 0.3, 1.0, 3.0, 30.0])
def test_elliptical_gaussian_against_scipy_strips(ratio: float, size: float) -> None:
    """Independent quadrature (strips with the error function), wanted to 1e-6."""
    a, narrow = 7e-3, 7e-3 / size
    assert fraction(a, narrow, narrow * ratio) == pytest.approx(
        by_strips(a, narrow, narrow * ratio), rel=1e-7
    )
    assert fraction(a, narrow * ratio, narrow) == fraction(a, narrow, narrow * ratio)


def test_elliptical_gaussian_against_mpmath() -> None:
    """Thirty-digit quadrature of the angular mean for 40 random ellipses up to an axis ratio of 1e4."""
    rng = np.random.default_rng(11)
    with mp.workdps(30):
        for _ in range(40):
            narrow = 10 ** rng.uniform(-4, 0)
            wide = narrow * 10 ** rng.uniform(0, 4)
            a = 10 ** rng.uniform(-2, 2) * rng.choice([narrow, wide])
            scale = min(1.0, math.hypot(narrow, a) / wide)
            ends = [scale * k for k in (0.05, 0.1, 0.2, 0.5, 1, 2, 4, 10, 30, 100, 1000) if scale * k < 1.5]
            mean = mp.quad(
                lambda p, a=a, n=narrow, w=wide: mp.exp(
                    -(a**2) / (n**2 * mp.cos(p) ** 2 + w**2 * mp.sin(p) ** 2)
                ),
                [0, *ends, mp.pi / 2],
            )
            assert fraction(a, narrow, wide) == pytest.approx(float(1 - 2 / mp.pi * mean), rel=1e-8)


@pytest.mark.parametrize(
    ("a_over_d", "inside"),
    [
        (1.0, 1 - math.exp(-1)),  # d63: 63 % inside the 1/e diameter (IEC 60825-1, from memory)
        (math.sqrt(2), 1 - math.exp(-2)),  # 86.5 % inside the 1/e2 diameter (textbook)
        (math.pi / math.sqrt(2), 1 - math.exp(-(math.pi**2) / 2)),  # aperture pi w: 99.3 % (textbook)
    ],
)
def test_round_gaussian_textbook_fractions(a_over_d: float, inside: float) -> None:
    assert fraction(a_over_d, 1.0, 1.0) == pytest.approx(inside, rel=1e-14)


@pytest.mark.parametrize(
    ("a", "x", "y"), [(1.0, 2.0, 4.0), (3.0, 2.0, 4.0), (5.0, 2.0, 4.0), (2.5, 2.0, 3.0)]
)
def test_elliptical_tophat_against_area(a: float, x: float, y: float) -> None:
    """Share of a uniform ellipse inside a disc, by integrating the shorter of the two half heights."""

    def height(u: float) -> float:
        return min(math.sqrt(max(0, a * a / 4 - u * u)), y / 2 * math.sqrt(max(0, 1 - (2 * u / x) ** 2)))

    area = 4 * integrate.quad(height, 0, min(a, x) / 2, limit=500, epsabs=1e-12)[0]
    assert fraction(a, x, y, tophat=True) == pytest.approx(area / (math.pi / 4 * x * y), rel=1e-6)


def test_round_diameter_is_the_inverse() -> None:
    inside = np.array([1e-12, 1e-6, 0.01, 0.5, 0.9, 0.999999])
    for tophat in (False, True):
        flat = np.full(inside.shape, tophat)
        d = round_diameter(np.full(inside.shape, 7e-3), inside, flat)
        assert encircled_fraction(np.full(inside.shape, 7e-3), d, d, flat) == pytest.approx(inside, rel=1e-12)


def test_shapes_and_edges() -> None:
    """Empty arrays pass; a point beam is all inside; a vast beam loses no digits."""
    empty = np.empty(0)
    assert encircled_fraction(empty, empty, empty, np.empty(0, bool)).shape == (0,)
    assert fraction(7e-3, 1e-9, 1e-9) == 1.0
    assert fraction(7e-3, 7e3, 7e3) == pytest.approx(1e-12, rel=1e-12)
    assert fraction(7e-3, 7e3, 1e3) == pytest.approx(7e-12, rel=1e-6)
