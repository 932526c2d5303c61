"""A beam that sweeps over a round aperture: how long it shines in, and how often."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.optics.beams import Beams

__all__ = ["Scan", "mean_chord_m", "passes"]

Floats = NDArray[np.float64]

#: Nodes and weights of the quadrature over the aperture; the result is good to 1e-6 relative (tested).
NODES, WEIGHTS = np.polynomial.legendre.leggauss(64)
#: Above this ratio of aperture to beam the chord is taken as the whole aperture (0.4 % too long: stricter).
NARROW = 8.0


@dataclass(frozen=True, slots=True)
class Scan:
    """A sweep to and fro along the x axis, counted from the scanner.

    `angle_rad`: full angle of the sweep; `sweeps_hz`: sweeps over the whole angle each second, to and fro
    counted apart; `sinusoidal`: the mirror swings like a pendulum, otherwise the speed is even. A raster
    draws `rows` sweeps above each other over `height_rad`, a line scan has one row.
    """

    angle_rad: float
    sweeps_hz: float
    sinusoidal: bool
    rows: int
    height_rad: float


def mean_chord_m(aperture_m: Floats, across_m: Floats, tophat: NDArray[np.bool_]) -> Floats:
    """Mean way [m] of the beam's power through a round aperture over which the beam sweeps centrally.

    Energy through the aperture in one pass = power x mean chord / speed: the chord 2 sqrt(a^2/4 - y^2)
    weighted with the profile across the sweep, w(y). Gaussian of 1/e diameter d:
    w = 2 / (sqrt(pi) d) exp(-4 y^2 / d^2); uniform ellipse: w = 4 / (pi d) sqrt(1 - 4 y^2 / d^2).

    Parameters
    ----------
    aperture_m : (n,) aperture diameter [m]
    across_m : (n,) diameter [m] of the beam across the sweep, 1/e, full for a top hat
    tophat : (n,)

    Derived here; the result never exceeds the aperture.
    """
    half = np.minimum(aperture_m, across_m) / 2.0
    # Uniform: y = half sin(theta) makes both square roots smooth.
    theta = NODES[None, :] * np.pi / 2.0
    y = half[:, None] * np.sin(theta)
    a2, d2 = (aperture_m**2)[:, None], (across_m**2)[:, None]
    uniform = np.sqrt(np.maximum(a2 - 4.0 * y * y, 0.0)) * 4.0 / (np.pi * across_m[:, None])
    uniform = uniform * np.sqrt(np.maximum(1.0 - 4.0 * y * y / d2, 0.0)) * half[:, None] * np.cos(theta)
    flat = (uniform * WEIGHTS).sum(axis=1) * np.pi / 2.0
    y = (aperture_m / 2.0)[:, None] * np.sin(theta)
    bell = (aperture_m[:, None] * np.cos(theta)) ** 2 * np.exp(-4.0 * y * y / d2)
    round_ = (bell * WEIGHTS).sum(axis=1) * np.pi / 2.0 / (np.sqrt(np.pi) * across_m)
    chord = np.where(tophat, flat, np.where(aperture_m > NARROW * across_m, aperture_m, round_))
    return np.minimum(chord, aperture_m)


def passes(
    scan: Scan, beams: Beams, aperture_m: Floats, distance_m: Floats, *, at_end: bool
) -> tuple[Floats, Floats]:
    """How long [s] one pass shines into an aperture, and how many passes come each second [1/s].

    The aperture lies in the middle of the sweep, or (`at_end`) at its turning point, where the beam comes
    half as often and stays longer. Duration = mean chord / (speed x fraction inside), so that power inside
    x duration is the energy of the pass; never longer than the time between passes. Of a raster, every row
    that can touch the aperture counts in full: min(rows, (aperture + beam) / spacing + 1), which is more
    than enters.

    Parameters
    ----------
    aperture_m, distance_m : (n,) aperture [m] and distance from the scanner [m], one per beam

    Reference: duration = width / speed (common practice, no source); the rest is derived here.
    """
    _, across = beams.diameters_m(distance_m)
    chord = mean_chord_m(aperture_m, across, beams.tophat)
    with np.errstate(divide="ignore", invalid="ignore"):
        width = np.where(
            distance_m > 0.0, chord / beams.fraction(aperture_m, distance_m) / distance_m, np.inf
        )
        share = width / scan.angle_rad
        if at_end:
            cycles = scan.sweeps_hz / 2.0
            inside = np.clip(1.0 - 2.0 * share, -1.0, 1.0)
            duration = np.arccos(inside) / (np.pi * cycles) if scan.sinusoidal else share / cycles
        else:
            cycles = scan.sweeps_hz
            duration = share / cycles / (np.pi / 2.0 if scan.sinusoidal else 1.0)
        spacing = distance_m * scan.height_rad / max(scan.rows - 1, 1)
        touching = np.where(spacing > 0.0, (aperture_m + across) / spacing + 1.0, np.inf)
    rate = cycles / scan.rows * np.minimum(scan.rows, touching)
    return np.minimum(duration, 1.0 / rate), rate
