"""Beams by their second moments: diameter, divergence and waist of each axis, as arrays."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.optics.encircled import encircled_fraction, round_diameter

__all__ = ["SQRT2", "Beams"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

#: 1/e2 diameter over 1/e diameter of a Gaussian (exp(-2) against exp(-1) of the peak).
SQRT2 = float(np.sqrt(2.0))


@dataclass(slots=True)
class Beams:
    """One beam per element, two axes: all arrays are 1-d of equal length.

    Gaussian: `diameter_x_m`, `diameter_y_m` are 1/e diameters [m] at the waist and `divergence_x_rad`,
    `divergence_y_rad` full 1/e angles [rad]. Top hat (`tophat` True): full widths and full angles.
    `waist_m`: waist position [m], positive downstream of the last element.
    """

    tophat: NDArray[np.bool_]
    diameter_x_m: Floats
    diameter_y_m: Floats
    divergence_x_rad: Floats
    divergence_y_rad: Floats
    waist_m: Floats

    def axes(self) -> tuple[tuple[Floats, Floats], ...]:
        """(diameter, divergence) of each axis."""
        return (
            (self.diameter_x_m, self.divergence_x_rad),
            (self.diameter_y_m, self.divergence_y_rad),
        )

    def take(self, index: Ints) -> Beams:
        """The beams at `index`."""
        return Beams(*(getattr(self, name)[index] for name in self.__slots__))

    def diameters_m(self, distance_m: Floats) -> tuple[Floats, Floats]:
        """Diameters [m] of both axes at a distance [m]: d(z)^2 = d0^2 + (phi (z - z0))^2.

        Reference: ISO 11146 (second moments of a beam along its axis), from memory.
        """
        away = distance_m - self.waist_m
        x, y = (np.sqrt(d * d + (phi * away) ** 2) for d, phi in self.axes())
        return x, y

    def fraction(self, aperture_m: Floats, distance_m: Floats) -> Floats:
        """Fraction of each beam inside a centred round aperture [m] at a distance [m]."""
        return encircled_fraction(aperture_m, *self.diameters_m(distance_m), self.tophat)

    def narrowest_m(self) -> Floats:
        """Narrowest accessible place [m]: the waist, or the exit where the waist lies upstream."""
        return np.maximum(0.0, self.waist_m)

    def reach_m(self, aperture_m: Floats, fraction: Floats) -> tuple[Floats, Floats]:
        """Bounds [m] of the distance at which the encircled fraction falls to `fraction`.

        The fraction of an elliptical beam lies between those of the round beams of its two axes, so
        the distances at which each axis alone reaches the round beam's diameter enclose the answer.
        For a round beam both are equal. Infinite where an axis never gets that wide; not below the
        waist.
        """
        wanted = round_diameter(aperture_m, fraction, self.tophat)
        reached = []
        for d0, phi in self.axes():
            grow = np.sqrt(np.maximum(wanted * wanted - d0 * d0, 0.0))
            with np.errstate(divide="ignore", invalid="ignore"):
                z = self.waist_m + np.where(grow > 0.0, grow / phi, 0.0)
            reached.append(np.maximum(z, self.narrowest_m()))
        return np.minimum(*reached), np.maximum(*reached)
