"""Bench elements: 2 x 2 matrices on the second moments of each axis, and reflectances."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from service.optics.beams import Beams

__all__ = ["Matrix", "expander", "fresnel", "lens", "mirror", "plate", "space", "through"]

Floats = NDArray[np.float64]

#: A focus is never taken as smaller than this [m].
LEAST_M = 1e-9


@dataclass(frozen=True, slots=True)
class Matrix:
    """A ray-transfer matrix ((a, b), (c, d)) for one axis: b in m, c in 1/m."""

    a: float
    b: float
    c: float
    d: float


def space(length_m: float) -> tuple[Matrix, Matrix]:
    """Free space of a length [m]: ((1, L), (0, 1)).

    Reference: Siegman, Lasers (1986), chapter 15, ray matrices (from memory), as for all of these.
    """
    both = Matrix(1.0, length_m, 0.0, 1.0)
    return both, both


def lens(focal_m: float) -> tuple[Matrix, Matrix]:
    """A thin lens of a focal length [m], negative for a diverging one: ((1, 0), (-1/f, 1))."""
    both = Matrix(1.0, 0.0, -1.0 / focal_m, 1.0)
    return both, both


def mirror(radius_m: float, incidence_rad: float) -> tuple[Matrix, Matrix]:
    """A curved mirror of a radius [m] (concave positive), hit at an angle [rad] in the x plane.

    x (tangential): f = R cos(theta) / 2; y (sagittal): f = R / (2 cos(theta)).
    """
    cosine = float(np.cos(incidence_rad))
    return (
        Matrix(1.0, 0.0, -2.0 / (radius_m * cosine), 1.0),
        Matrix(1.0, 0.0, -2.0 * cosine / radius_m, 1.0),
    )


def expander(magnification: float) -> tuple[Matrix, Matrix]:
    """An afocal beam expander: diameters x M, angles / M: ((M, 0), (0, 1/M))."""
    both = Matrix(magnification, 0.0, 0.0, 1.0 / magnification)
    return both, both


def through(beams: Beams, matrices: tuple[Matrix, Matrix]) -> Beams:
    """Beams behind an element, distances counted from it.

    A beam of waist d0 at z0 has the position amplitudes P = (d0, -phi z0) and the angle amplitudes
    Q = (0, phi) at z = 0; its second moments are P.P, P.Q and Q.Q. Both amplitudes obey the matrix:
    P' = a P + b Q, Q' = c P + d Q. Backwards: phi = |Q'|, z0 = -P'.Q' / |Q'|^2, d0 phi is kept. (The
    moments themselves would lose half of the digits where a strong lens is undone.)

    Reference: ISO 11146 (propagation of second moments), from memory.
    """
    changed = {}
    axes = zip(("x", "y"), beams.axes(), matrices, strict=True)
    for name, (d0, phi, z0), m in axes:
        across, shift = d0, -phi * z0
        p = m.a * across, m.a * shift + m.b * phi
        q = m.c * across, m.c * shift + m.d * phi
        spread = np.hypot(*q)
        moving = spread > 0.0
        safe = np.where(moving, spread, 1.0)
        # A beam without divergence has no waist to speak of: behind a lens it has a point focus.
        waist = np.where(moving, d0 * phi / safe, np.hypot(*p))
        changed[f"diameter_{name}_m"] = np.maximum(waist, LEAST_M)
        changed[f"divergence_{name}_rad"] = spread
        changed[f"waist_{name}_m"] = np.where(moving, -(p[0] * q[0] + p[1] * q[1]) / safe**2, 0.0)
    return replace(beams, **changed)


def fresnel(index: float, incidence_rad: float, polarisation: str) -> float:
    """Reflectance of one surface from air into a medium of a refractive index.

    R_s = ((cos i - n cos t) / (cos i + n cos t))^2, R_p = ((n cos i - cos t) / (n cos i + cos t))^2,
    unpolarised light their mean; sin t = sin i / n, total reflection where that exceeds 1.

    Reference: Born and Wolf, Principles of Optics, section 1.5 (from memory).
    """
    sine = np.sin(incidence_rad) / index
    if abs(sine) >= 1.0:
        return 1.0
    i, t = float(np.cos(incidence_rad)), float(np.sqrt(1.0 - sine * sine))
    s = ((i - index * t) / (i + index * t)) ** 2
    p = ((index * i - t) / (index * i + t)) ** 2
    return {"s": s, "p": p, "unpolarised": (s + p) / 2.0}[polarisation]


def plate(reflectance: float) -> float:
    """Reflectance of a plate with two equal surfaces, all passes added without interference: 2R / (1 + R)."""
    return 2.0 * reflectance / (1.0 + reflectance)
