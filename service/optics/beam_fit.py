"""Waist, divergence and M2 from beam diameters measured along the beam."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["BeamFit", "NoBeam", "fit_beam"]

Floats = NDArray[np.float64]

#: Coverage factor of a 95 % interval of a normal distribution, rounded up (GUM, from memory).
COVERAGE = 2.0
#: The same where the scatter itself comes from so few points: Student's t for 1, 2, ... degrees of freedom,
#: rounded up (GUM, table G.2, from memory).
STUDENT = (12.71, 4.31, 3.19, 2.78, 2.58, 2.45, 2.37, 2.31, 2.27, 2.23, 2.21, 2.18, 2.17, 2.15, 2.14)
LATER = 2.13
STEP = 1e-6


class NoBeam(ValueError):
    """The diameters fit no beam; the message says why."""


@dataclass(frozen=True, slots=True)
class BeamFit:
    """A beam along one axis. `uncertainty_*` are expanded (95 %).

    `waist_diameter_m`, `waist_m` (its place), `divergence_rad` (full angle), `m2`, `rayleigh_m`;
    `residuals_m` measured minus fitted diameter of each point; `freedom` points beyond the three figures.
    """

    waist_diameter_m: float
    waist_m: float
    divergence_rad: float
    m2: float
    rayleigh_m: float
    uncertainty_waist_diameter_m: float
    uncertainty_waist_m: float
    uncertainty_divergence_rad: float
    uncertainty_m2: float
    residuals_m: Floats
    freedom: int


def fit_beam(
    distance_m: Floats, diameter_m: Floats, uncertainty_m: Floats | None, scale: float, wavelength_m: float
) -> BeamFit:
    """Fit d^2 = a + b z + c z^2, then z0 = -b / 2c, d0 = sqrt(a - b^2 / 4c), theta = sqrt(c).

    M2 = pi theta d0 / (4 lambda). Least squares, each d^2 weighted by its own uncertainty 2 d u(d); without
    one a constant share of the diameter is taken and its size follows from the scatter. Where points
    scatter more than their uncertainties say, these are raised to match.

    Parameters
    ----------
    distance_m, diameter_m : (n,) places and second-moment (1/e2) diameters [m]
    uncertainty_m : (n,) expanded uncertainty (95 %) of each diameter, independent of the others [m]
    scale : expanded relative uncertainty (95 %) that all diameters share, from the instrument
    wavelength_m : wavelength [m]

    Raises
    ------
    NoBeam
        fewer than three places; too few points to tell the scatter; no divergence or no waist.

    Reference: ISO 11146-1, hyperbolic fit of second-moment diameters (from memory); uncertainty by
    linear propagation after the GUM (from memory).
    """
    if len(np.unique(distance_m)) < 3:
        raise NoBeam("diameters at three distances or more are needed")
    freedom = len(distance_m) - 3
    if uncertainty_m is None and freedom < 1:
        raise NoBeam("three diameters without an uncertainty of their own leave the scatter open")
    # Places and squares in units near 1, so that the normal equations are well behaved.
    middle, span = distance_m.mean(), np.ptp(distance_m)
    size = diameter_m.mean()
    z, squared = (distance_m - middle) / span, (diameter_m / size) ** 2
    own = diameter_m if uncertainty_m is None else uncertainty_m / COVERAGE
    weight = 1.0 / (2.0 * diameter_m * own / size**2)
    design = np.stack([np.ones_like(z), z, z * z], axis=1) * weight[:, None]
    solved, _, rank, _ = np.linalg.lstsq(design, squared * weight, rcond=None)
    try:
        covariance = np.linalg.inv(design.T @ design)
    except np.linalg.LinAlgError:
        rank = 0
    if rank < 3:
        raise NoBeam("the distances, or the diameters, lie too unevenly to tell three figures from them")
    spare = squared * weight - design @ solved
    scatter = float(spare @ spare) / freedom if freedom else 1.0
    covariance *= scatter if uncertainty_m is None else max(1.0, scatter)
    figures = _figures(solved, middle, span, size, wavelength_m)
    steps = STEP * np.maximum(np.abs(solved), 1e-3)
    slope = np.stack(
        [
            (
                _figures(solved + step * axis, middle, span, size, wavelength_m)
                - _figures(solved - step * axis, middle, span, size, wavelength_m)
            )
            / (2.0 * step)
            for step, axis in zip(steps, np.eye(3), strict=True)
        ],
        axis=1,
    )
    factor = COVERAGE
    if uncertainty_m is None:
        factor = STUDENT[freedom - 1] if freedom <= len(STUDENT) else LATER
    independent = factor * np.sqrt(np.einsum("ij,jk,ik->i", slope, covariance, slope))
    shared = np.abs(figures) * np.array([scale, 0.0, scale, 2.0 * scale])
    expanded = np.hypot(independent, shared)
    waist, place, divergence, m2 = figures.tolist()
    fitted = np.sqrt(waist**2 + (divergence * (distance_m - place)) ** 2)
    return BeamFit(
        waist,
        place,
        divergence,
        m2,
        waist / divergence,
        float(expanded[0]),
        float(expanded[1]),
        float(expanded[2]),
        float(expanded[3]),
        residuals_m=diameter_m - fitted,
        freedom=freedom,
    )


def _figures(solved: Floats, middle: float, span: float, size: float, wavelength_m: float) -> Floats:
    """Waist diameter, its place, divergence and M2 from the coefficients in scaled units."""
    a, b, c = solved
    inner = a - b * b / (4.0 * c) if c > 0.0 else -1.0
    if c <= 0.0:
        raise NoBeam("the diameters show no divergence: measure farther apart")
    if inner <= 0.0:
        raise NoBeam("the diameters show no waist: measure nearer to it, at least within one Rayleigh length")
    waist = size * np.sqrt(inner)
    place = middle - span * b / (2.0 * c)
    divergence = size / span * np.sqrt(c)
    return np.array([waist, place, divergence, np.pi * divergence * waist / (4.0 * wavelength_m)])
