"""Beams along their axis: second moments by hand, and the bounds for distances."""

from __future__ import annotations

import math

import numpy as np
import pytest

from service.optics.beams import Beams


def beams(
    d: tuple[float, float], phi: tuple[float, float], waist: float = 0.0, tophat: bool = False
) -> Beams:
    columns = [np.array([v]) for v in (*d, *phi, waist)]
    return Beams.with_waist(np.array([tophat]), *columns)


def test_diameter_is_the_hyperbola() -> None:
    """ISO 11146 (from memory): d(z)^2 = d0^2 + (phi (z - z0))^2; 3-4-5 triangle by hand."""
    x, y = beams((3e-3, 6e-3), (1e-3, 2e-3), waist=2.0).diameters_m(np.array([6.0]))
    assert x[0] == pytest.approx(5e-3, rel=1e-15)
    assert y[0] == pytest.approx(10e-3, rel=1e-15)


def test_far_field_is_the_linear_spread() -> None:
    """Far away d(z) = phi z, the textbook's beam spread."""
    x, _ = beams((1e-3, 1e-3), (1e-3, 1e-3)).diameters_m(np.array([1e5]))
    assert x[0] == pytest.approx(100.0, rel=1e-9)


def test_reach_encloses_elliptical_and_is_exact_for_round() -> None:
    """A round beam reaches fraction F where d^2 = a^2 / -ln(1 - F): closed form by hand."""
    fraction = 1 - math.exp(-0.01)  # then d = 10 a = 70 mm
    low, high = beams((3e-3, 3e-3), (1e-3, 1e-3), waist=1.0).reach_m(np.array([7e-3]), np.array([fraction]))
    assert low[0] == high[0] == pytest.approx(1.0 + math.sqrt(70e-3**2 - 3e-3**2) / 1e-3, rel=1e-12)
    low, high = beams((3e-3, 3e-3), (1e-3, 4e-3)).reach_m(np.array([7e-3]), np.array([fraction]))
    assert high[0] == pytest.approx(4 * low[0], rel=1e-12)


def test_reach_is_infinite_without_divergence() -> None:
    low, high = beams((1e-3, 1e-3), (0.0, 1e-3)).reach_m(np.array([7e-3]), np.array([0.01]))
    assert math.isinf(high[0])
    assert math.isfinite(low[0])
