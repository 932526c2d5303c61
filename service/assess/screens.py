"""What the beams of a laser load on a window, wall or screen."""

from __future__ import annotations

from dataclasses import dataclass

from service.assess.lines import CW, Lines
from service.assess.scales import scale_needs, spot_area_m2
from service.rules.eyewear import EyewearTables

__all__ = ["ScreenLoad", "screen_load"]


@dataclass(frozen=True, slots=True)
class ScreenLoad:
    """Average irradiance [W/m2] of all lines, the strongest pulse [J/m2], the AB number of EN 12254.

    `radiant_exposure_j_m2` is None where no line is pulsed; `number` above 10 is beyond the scale.
    """

    irradiance_w_m2: float
    radiant_exposure_j_m2: float | None
    number: int
    within_scope: bool


def screen_load(lines: Lines, distance_m: float, tables: EyewearTables) -> ScreenLoad:
    """The load of one laser at a distance [m]; scope of EN 12254 from memory."""
    irradiance, pulse, mean, energy, number = 0.0, None, 0.0, 0.0, 0
    for k in range(lines.count):
        area, _ = spot_area_m2(lines, k, distance_m)
        power = float(lines.average_power_w[k])
        irradiance, mean = irradiance + power / area, mean + power
        if lines.mode[k] != CW:
            emitted = float(lines.emitted[k])
            pulse, energy = max(pulse or 0.0, emitted / area), max(energy, emitted)
        number = max([number, *(s.number for s in scale_needs(lines, k, distance_m, tables))])
    use = tables.use
    inside = mean <= use["en12254_mean_power"].value and energy <= use["en12254_pulse_energy"].value
    return ScreenLoad(irradiance, pulse, number, inside)
