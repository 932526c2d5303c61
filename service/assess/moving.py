"""Setups whose limits change with the distance: a lit spot looks smaller, a sweeping beam passes faster.

Someone at a distance is a laser of a batch, so that many distances are judged in one pass. A setup offers
several variants at every distance (the spot by its mean and by its smaller width, the sweep in the middle
and at its turning point); each is judged by itself and the worst counts.
"""

from __future__ import annotations

from dataclasses import dataclass, fields, replace

import numpy as np
from numpy.typing import NDArray

from service.assess.aid import Aid
from service.assess.lines import CW, TRAIN, Lines
from service.optics.beams import Beams
from service.optics.sweep import Scan, passes
from service.rules.grid import SMALL_SOURCE_MRAD

__all__ = ["NEAREST_M", "Setup", "Spots", "lambertian", "spread_over"]

Floats = NDArray[np.float64]

#: Nobody looks at a lit spot from nearer than this [m] (IEC 60825-1, apparent sources, from memory).
NEAREST_M = 0.1


@dataclass(frozen=True, slots=True)
class Spots:
    """Lit spots on a diffuser, one per line: widths [m] (1/e, full of a top hat), viewing angle [rad]."""

    x_m: Floats
    y_m: Floats
    viewing_rad: float

    def through(self, aid: Aid | None, lines: Lines) -> Spots:
        """The spots as large as they look through an optical aid."""
        if aid is None:
            return self
        larger = np.where(aid.passes(lines.wavelength_nm), aid.magnification, 1.0)
        return replace(self, x_m=self.x_m * larger, y_m=self.y_m * larger)

    def subtenses_mrad(self, distance_m: Floats, trusted_mrad: Floats) -> list[Floats]:
        """Angular subtense [mrad] of every spot at distances, in the ways that must be judged.

        The mean of both axes, the wider one foreshortened by the viewing angle and none smaller than
        1.5 mrad (IEC 60825-1, oblong sources, from memory). Where an axis looks wider than the angle
        `trusted_mrad`, the smaller axis alone is judged too: the mean can flatter such a spot.

        Parameters
        ----------
        distance_m : (places,); trusted_mrad : (spots,)

        Returns
        -------
        list of (places, spots)
        """
        wide, narrow = np.maximum(self.x_m, self.y_m), np.minimum(self.x_m, self.y_m)
        foreshortened = wide * np.cos(self.viewing_rad)
        axes = [1e3 * d / distance_m[:, None] for d in (foreshortened, narrow)]
        first, second = (np.maximum(a, SMALL_SOURCE_MRAD) for a in axes)
        mean, least = (first + second) / 2.0, np.minimum(first, second)
        doubtful = np.maximum(first, second) > trusted_mrad
        return [mean, np.where(doubtful, least, mean)] if (doubtful & (mean > least)).any() else [mean]


def lambertian(lines: Lines, viewing_rad: float) -> Beams:
    """What a small Lambertian spot sends towards an angle [rad], as beams.

    E = P cos(theta) / (pi r^2) is the irradiance of a top hat of full angle 2 / sqrt(cos(theta)).

    Reference: Lambert's cosine law; ANSI Z136.1 appendix B, diffuse reflection (from memory). A spot of
    some width gives less on its axis; the formula of a small one is kept.
    """
    count = lines.count
    angle = np.full(count, 2.0 / np.sqrt(np.cos(viewing_rad)))
    point, zeros = np.full(count, 1e-9), np.zeros(count)
    beams = Beams.with_waist(np.ones(count, dtype=bool), point, point.copy(), angle, angle.copy(), zeros)
    return replace(
        beams, nearest_m=np.full(count, NEAREST_M), extinction_per_m=lines.beams.extinction_per_m.copy()
    )


def spread_over(lines: Lines, places: int) -> Lines:
    """The lines of one laser once for each of some places, every place a laser of its own."""
    columns = {
        f.name: np.tile(getattr(lines, f.name), places)
        for f in fields(lines)
        if f.name not in ("laser", "beams")
    }
    index = np.tile(np.arange(lines.count), places)
    return Lines(laser=np.repeat(np.arange(places), lines.count), beams=lines.beams.take(index), **columns)


@dataclass(frozen=True, slots=True)
class Setup:
    """One laser whose light ends on a diffuser (`spots`) or is swept (`scan`).

    `lines` stand behind the bench: of a spot what it scatters, of a scan the standing beam.
    """

    lines: Lines
    spots: Spots | None = None
    scan: Scan | None = None

    def from_distances(self, distance_m: Floats, aperture_m: Floats, trusted_mrad: Floats) -> list[Lines]:
        """The lines as they meet somebody at each distance [m], in every variant to judge.

        Per line: `aperture_m`, the widest limiting aperture that it meets; `trusted_mrad` as in `Spots`.
        """
        base = spread_over(self.lines, len(distance_m))
        if self.spots is not None:
            seen = self.spots.subtenses_mrad(distance_m, trusted_mrad)
            return [replace(base, subtense_mrad=a.ravel()) for a in seen]
        assert self.scan is not None
        return [self._swept(base, distance_m, aperture_m, at_end=end) for end in (False, True)]

    def _swept(self, base: Lines, distance_m: Floats, aperture_m: Floats, *, at_end: bool) -> Lines:
        """Continuous lines become trains of passes. Pulses are judged as if the beam stood still."""
        assert self.scan is not None
        place = np.repeat(distance_m, self.lines.count)
        aperture = np.tile(aperture_m, len(distance_m))
        duration, rate = passes(self.scan, base.beams, aperture, place, at_end=at_end)
        duration = np.minimum(duration, base.exposure_s)
        swept = base.mode == CW
        return replace(
            base,
            mode=np.where(swept, TRAIN, base.mode),
            emitted=np.where(swept, base.emitted * duration, base.emitted),
            pulse_s=np.where(swept, duration, base.pulse_s),
            rate_hz=np.where(swept, rate, base.rate_hz),
        )

    def places(self, farthest_m: float, edges_mrad: Floats) -> Floats:
        """Distances [m], ascending, between which every ratio only falls or jumps.

        Even steps in powers of ten, the waists, and for spots both sides of the distances at which they
        subtend one of the angles `edges_mrad`.
        """
        beams = self.lines.beams
        nearest, last = float(beams.nearest_m[0]), float(beams.last_waist_m().max())
        found = [nearest, *np.geomspace(max(nearest, 1e-3), max(farthest_m, 1.0), 240).tolist()]
        if last > nearest:
            found += np.linspace(nearest, last, 96).tolist()
            found += [z for axis in beams.axes() for z in axis[2].tolist()]
        if self.spots is not None:
            slant = np.cos(self.spots.viewing_rad)
            widths = np.r_[self.spots.x_m, self.spots.y_m, self.spots.x_m * slant, self.spots.y_m * slant]
            mean = np.r_[self.spots.x_m * slant + self.spots.y_m, self.spots.x_m + self.spots.y_m * slant] / 2
            edges = (1e3 * np.r_[widths, mean][:, None] / edges_mrad).ravel()
            found += [*(edges * (1.0 - 1e-9)).tolist(), *(edges * (1.0 + 1e-9)).tolist()]
        places = np.unique(np.array(found))
        kept: Floats = places[(places >= nearest) & (places <= max(farthest_m, 1.0))]
        return kept
