"""How far a beam dazzles: visually corrected irradiance against levels for pilots."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from service.assess.distance import falling_root
from service.assess.lines import PULSE, Lines

__all__ = ["VISUAL_S", "interference_m", "visual_power_w"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

#: A single flash counts as if its energy came in this time [s] (common practice, no source).
VISUAL_S = 0.1
#: Places tried between the exit and the last waist.
PLACES = 128


def visual_power_w(lines: Lines, efficiency: Floats) -> Floats:
    """Visually corrected power [W] of each line: average power x V; of one pulse energy / 0.1 s x V."""
    flash = np.where(lines.mode == PULSE, lines.emitted / VISUAL_S, 0.0)
    return (lines.average_power_w + flash) * efficiency


def _irradiance(lines: Lines, power_w: Floats, distance_m: Floats) -> Floats:
    """Visually corrected irradiance [W/m2] on the axis of one laser, lines added, at distances (p,) [m]."""
    places, count = len(distance_m), lines.count
    beams = lines.beams.take(np.tile(np.arange(count), places))
    far = np.repeat(distance_m, count)
    x, y = beams.diameters_m(far)
    each = np.tile(power_w, places) / (np.pi / 4.0 * x * y) * np.exp(-beams.extinction_per_m * far)
    summed: Floats = each.reshape(places, count).sum(axis=1)
    return summed


def interference_m(lines: Lines, efficiency: Floats, levels_w_m2: Floats) -> Floats:
    """Largest distance [m] at which the lines of one laser together exceed each level.

    The irradiance is that on the axis: P / (pi d_x d_y / 4) with 1/e diameters of a Gaussian beam. 0 where
    a level is nowhere exceeded, infinite where the beam does not spread.

    Parameters
    ----------
    efficiency : (lines,) luminous efficiency V
    levels_w_m2 : (levels,)

    Reference: FAA AC 70-1B (visually corrected irradiance, average power), from memory.
    """
    power = visual_power_w(lines, efficiency)
    nearest = float(lines.beams.nearest_m.max())
    last = max(nearest, float(lines.beams.last_waist_m().max()))
    places = np.unique(np.linspace(nearest, last, PLACES))
    over = _irradiance(lines, power, places)[:, None] > levels_w_m2
    found = np.zeros(len(levels_w_m2))
    some = np.flatnonzero(over.any(axis=0))
    if not some.size:
        return found
    k = len(places) - 1 - over[::-1, some].argmax(axis=0)
    high = np.where(k == len(places) - 1, np.inf, places[np.minimum(k + 1, len(places) - 1)])

    def excess(index: Ints, z: Floats) -> Floats:
        return np.log(np.maximum(_irradiance(lines, power, z), 1e-300) / levels_w_m2[some[index]])

    found[some] = falling_root(excess, places[k], high)
    return found
