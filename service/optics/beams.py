"""Beams by their second moments: diameter, divergence and waist of each axis, as arrays."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.optics.encircled import encircled_fraction, round_diameter

__all__ = ["SQRT2", "Beams"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

#: 1/e2 diameter over 1/e diameter of a Gaussian (exp(-2) against exp(-1) of the peak).
SQRT2 = float(np.sqrt(2.0))
#: Places tried between two waists, and steps of narrowing around the best of them.
BETWEEN, NARROWINGS = 65, 60


@dataclass(slots=True)
class Beams:
    """One beam per element, two axes: all arrays are 1-d of equal length.

    Gaussian: `diameter_x_m`, `diameter_y_m` are 1/e diameters [m] at the waist of each axis and
    `divergence_x_rad`, `divergence_y_rad` full 1/e angles [rad]. Top hat (`tophat` True): full widths
    and full angles. `waist_x_m`, `waist_y_m`: waist position [m], positive downstream of the last
    element. `extinction_per_m`: loss of power in the air [1/m], 0 for clear air. `nearest_m`: nearest
    accessible place [m], 0 for the exit or last element itself.
    """

    tophat: NDArray[np.bool_]
    diameter_x_m: Floats
    diameter_y_m: Floats
    divergence_x_rad: Floats
    divergence_y_rad: Floats
    waist_x_m: Floats
    waist_y_m: Floats
    extinction_per_m: Floats
    nearest_m: Floats

    @classmethod
    def with_waist(
        cls, tophat: NDArray[np.bool_], dx_m: Floats, dy_m: Floats, px: Floats, py: Floats, waist_m: Floats
    ) -> Beams:
        """Beams whose axes share their waist, in clear air, accessible from the exit on.

        Diameters `dx_m`, `dy_m` [m] and full angles `px`, `py` [rad] as of the class.
        """
        zeros = np.zeros(len(tophat))
        return cls(tophat, dx_m, dy_m, px, py, waist_m, waist_m.copy(), zeros, zeros.copy())

    def axes(self) -> tuple[tuple[Floats, Floats, Floats], ...]:
        """(diameter, divergence, waist) of each axis."""
        return (
            (self.diameter_x_m, self.divergence_x_rad, self.waist_x_m),
            (self.diameter_y_m, self.divergence_y_rad, self.waist_y_m),
        )

    def take(self, index: Ints) -> Beams:
        """The beams at `index`."""
        return Beams(*(getattr(self, name)[index] for name in self.__slots__))

    def diameters_m(self, distance_m: Floats) -> tuple[Floats, Floats]:
        """Diameters [m] of both axes at a distance [m]: d(z)^2 = d0^2 + (phi (z - z0))^2.

        Reference: ISO 11146 (second moments of a beam along its axis), from memory.
        """
        x, y = (np.sqrt(d * d + (phi * (distance_m - z0)) ** 2) for d, phi, z0 in self.axes())
        return x, y

    def fraction(self, aperture_m: Floats, distance_m: Floats) -> Floats:
        """Fraction of each beam inside a centred round aperture [m] at a distance [m], air included."""
        inside = encircled_fraction(aperture_m, *self.diameters_m(distance_m), self.tophat)
        if self.extinction_per_m.any():
            inside *= np.exp(-self.extinction_per_m * distance_m)
        return inside

    def uneven(self) -> NDArray[np.bool_]:
        """Beams whose fraction need not fall steadily on both sides of one waist."""
        hazy = (self.extinction_per_m > 0.0) & (self.last_waist_m() > self.nearest_m)
        differ: NDArray[np.bool_] = self.first_waist_m() != self.last_waist_m()
        return differ | hazy

    def last_waist_m(self) -> Floats:
        """Distance [m] beyond which both axes only widen: the farther waist, or the nearest place."""
        return np.maximum(self.nearest_m, np.maximum(self.waist_x_m, self.waist_y_m))

    def first_waist_m(self) -> Floats:
        """The nearer waist [m] seen from the nearest accessible place on."""
        return np.maximum(self.nearest_m, np.minimum(self.waist_x_m, self.waist_y_m))

    def narrowest_m(self) -> Floats:
        """Accessible place [m] where the beam covers the smallest area."""

        def smallness(index: Ints, place_m: Floats) -> Floats:
            x, y = self.take(index).diameters_m(place_m)
            return -x * y

        return _highest(smallness, self.first_waist_m(), self.last_waist_m())

    def most_inside(self, aperture_m: Floats, distance_m: Floats) -> Floats:
        """Largest fraction inside a centred aperture [m] at a distance [m] or anywhere beyond it."""

        def inside(index: Ints, place_m: Floats) -> Floats:
            return self.take(index).fraction(aperture_m[index], place_m)

        far = np.maximum(distance_m, self.last_waist_m())
        clear = self.extinction_per_m == 0.0
        near = np.where(clear, np.maximum(distance_m, self.first_waist_m()), distance_m)
        return self.fraction(aperture_m, _highest(inside, near, far))

    def reach_m(self, aperture_m: Floats, fraction: Floats) -> tuple[Floats, Floats]:
        """Bounds [m] of the distance at which the encircled fraction falls to `fraction`.

        The fraction of an elliptical beam lies between those of the round beams of its two axes, so
        the distances at which each axis alone reaches the round beam's diameter enclose the answer.
        For a round beam in clear air both are equal. Infinite where an axis never gets that wide; not
        below the last waist.
        """
        wanted = round_diameter(aperture_m, fraction, self.tophat)
        last = self.last_waist_m()
        reached = []
        for d0, phi, z0 in self.axes():
            grow = np.sqrt(np.maximum(wanted * wanted - d0 * d0, 0.0))
            with np.errstate(divide="ignore", invalid="ignore"):
                z = z0 + np.where(grow > 0.0, grow / phi, 0.0)
            reached.append(np.maximum(z, last))
        low, high = np.minimum(*reached), np.maximum(*reached)
        return np.where(self.extinction_per_m > 0.0, last, low), high


def _highest(value: Callable[[Ints, Floats], Floats], near: Floats, far: Floats) -> Floats:
    """Place [m] from `near` to `far` with the highest value; `value` takes indices and places.

    Both ends and even steps are tried, then the surroundings of the best are narrowed.
    """
    best = far.copy()
    index = np.flatnonzero(near != far)
    if not index.size:
        return best
    low, high = near[index], far[index]
    places = low[:, None] + (high - low)[:, None] * np.linspace(0.0, 1.0, BETWEEN)
    values = np.stack([value(index, places[:, k]) for k in range(BETWEEN)], axis=1)
    k, rows = values.argmax(axis=1), np.arange(len(index))
    place, top = places[rows, k], values[rows, k]
    low, high = places[rows, np.maximum(k - 1, 0)], places[rows, np.minimum(k + 1, BETWEEN - 1)]
    for _ in range(NARROWINGS):
        left, right = low + (high - low) / 3.0, high - (high - low) / 3.0
        at_left, at_right = value(index, left), value(index, right)
        for z, v in ((left, at_left), (right, at_right)):
            place, top = np.where(v > top, z, place), np.maximum(v, top)
        low, high = np.where(at_left < at_right, left, low), np.where(at_left < at_right, high, right)
    best[index] = place
    return best
