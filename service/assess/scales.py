"""Scale numbers that a line asks of eyewear and screens at a place."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from service.assess.lines import CW, PULSE, Lines
from service.rules.eyewear import EyewearTables, ScaleRow

__all__ = ["AlignmentNeed", "ScaleNeed", "alignment_need", "scale_needs", "spot_area_m2"]

#: Slack [decades] against rounding: a value on the bound of a scale number still takes that number.
SLACK = 1e-9
APERTURE_M = 7e-3


@dataclass(frozen=True, slots=True)
class ScaleNeed:
    """What one mode asks for.

    `value` is the irradiance [W/m2] or radiant exposure [J/m2] that counts, after the pulse number
    `pulses`; `number` the scale number needed (0: none), `wide` the same with the size factor of a
    wide beam (mode D); both may exceed the end of the scale.
    """

    mode: str
    row: ScaleRow
    value: float
    pulses: float
    number: int
    size_factor: float
    wide: int


@dataclass(frozen=True, slots=True)
class AlignmentNeed:
    """Alignment eyewear: power [W] or pulse energy [J] through 7 mm, the scale number, None beyond it."""

    value: float
    unit: str
    number: int | None


def spot_area_m2(lines: Lines, line: int, distance_m: float) -> tuple[float, float]:
    """Area [m2] and larger diameter [m] of a line's beam at a distance: d63 (1/e), or the full top hat."""
    x, y = lines.beams.take(np.array([line])).diameters_m(np.array([distance_m]))
    return float(np.pi / 4.0 * x[0] * y[0]), float(max(x[0], y[0]))


def _number(row: ScaleRow, value: float) -> int:
    """Scale number n with coefficient x 10^(n + offset) >= value, at least 0."""
    if value <= 0.0:
        return 0
    return max(0, math.ceil(math.log10(value / row.coefficient) - row.exponent_offset - SLACK))


def scale_needs(lines: Lines, line: int, distance_m: float, tables: EyewearTables) -> list[ScaleNeed]:
    """Every mode that a line must be tested for, after EN 207 (numbers also serve EN 12254).

    Reference: scale table of EN 207:2017 (read in an encyclopaedia article), rules of use in DGUV
    Information 203-042, section 5 (read); size factor from memory.
    """
    area, diameter = spot_area_m2(lines, line, distance_m)
    wavelength, emitted = float(lines.wavelength_nm[line]), float(lines.emitted[line])
    if lines.mode[line] == CW:
        return [_continuous(emitted / area, wavelength, diameter, tables)]
    pulse, rate = float(lines.pulse_s[line]), float(lines.rate_hz[line])
    mode = tables.mode(pulse)
    if mode == "D":
        needs = [_continuous(emitted / pulse / area, wavelength, diameter, tables)]
    else:
        row = tables.scale(mode, wavelength)
        value, pulses = emitted / area, 1.0
        if row.quantity == "E":
            value = emitted / pulse / area
        elif lines.mode[line] != PULSE:
            value, pulses = _with_pulse_number(value, pulse, rate, wavelength, tables)
        number = _number(row, value)
        needs = [ScaleNeed(mode, row, value, pulses, number, 1.0, number)]
    if lines.mode[line] != PULSE:
        needs.append(_continuous(emitted * rate / area, wavelength, diameter, tables))
    return needs


def _continuous(irradiance: float, wavelength: float, diameter_m: float, tables: EyewearTables) -> ScaleNeed:
    """Mode D, without and with the size factor d^k of beams wider than 1 mm (d in mm, held at 15 mm)."""
    row = tables.scale("D", wavelength)
    factor = 1.0
    band = tables.use["size_exponent_glass_first"]
    if wavelength >= (band.wavelength_from_nm or 0.0):
        width = min(max(diameter_m * 1e3, tables.use["size_from"].value), tables.use["size_to"].value)
        factor = width**band.value
    return ScaleNeed(
        "D", row, irradiance, 1.0, _number(row, irradiance), factor, _number(row, irradiance * factor)
    )


def _with_pulse_number(
    value: float, pulse: float, rate: float, wavelength: float, tables: EyewearTables
) -> tuple[float, float]:
    """H x N^(1/4) with N the pulses, or groups of pulses, in 5 s."""
    use = tables.use
    low = use["count_window"].wavelength_from_nm or 0.0
    if rate <= use["count_rate_above"].value or pulse >= use["count_pulse_below"].value or wavelength < low:
        return value, 1.0
    pulses = use["count_window"].value * rate
    group = tables.group_time(wavelength)
    if group is not None and rate * group.value >= 1.0:
        value *= rate * group.value
        pulses = max(1.0, use["group_count"].value / group.value)
    return value * pulses ** use["count_exponent"].value, pulses


def alignment_need(lines: Lines, line: int, distance_m: float, tables: EyewearTables) -> AlignmentNeed | None:
    """Scale number of alignment eyewear after EN 208; None outside 400 to 700 nm and below 1 ns."""
    wavelength = float(lines.wavelength_nm[line])
    rows = tables.alignment
    if not rows[0].wavelength_from_nm <= wavelength <= rows[0].wavelength_to_nm:
        return None
    beam = lines.beams.take(np.array([line]))
    through = float(lines.emitted[line] * beam.fraction(np.array([APERTURE_M]), np.array([distance_m]))[0])
    pulse, rate = float(lines.pulse_s[line]), float(lines.rate_hz[line])
    use = tables.use
    if lines.mode[line] != CW and pulse <= use["en208_split"].value:
        if pulse < 1e-9:
            return None
        repeated = 1.0 if lines.mode[line] == PULSE else max(1.0, rate * use["en208_pulse_window"].value)
        value, unit = through * repeated ** use["en208_count_exponent"].value, "J"
        enough = [r for r in rows if r.max_energy_j >= value]
        safe = value <= rows[0].max_energy_j * 0.1
    else:
        power = through if lines.mode[line] == CW else through / pulse
        value, unit = power, "W"
        enough = [r for r in rows if r.max_power_w >= value]
        safe = value <= use["en208_target_power"].value
    number = 0 if safe else int(enough[0].scale) if enough else None
    return AlignmentNeed(value, unit, number)
