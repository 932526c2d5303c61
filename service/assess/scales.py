"""Scale numbers that a line asks of eyewear and screens at a place."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from service.assess.lines import CW, PULSE, TRAIN, Lines
from service.rules.eyewear import EyewearTables, ScaleRow, UseRow

__all__ = [
    "SLACK",
    "AlignmentNeed",
    "ScaleNeed",
    "alignment_need",
    "scale_needs",
    "scale_number",
    "spot_area_m2",
]

#: Slack [decades] against rounding: a value on the bound of a scale number still takes that number.
SLACK = 1e-9


@dataclass(frozen=True, slots=True)
class ScaleNeed:
    """What one mode asks for.

    `text` says how the irradiance [W/m2] or radiant exposure [J/m2] of one pulse, or of one group of
    pulses, is reckoned; `value` is what counts, after the pulse number `pulses`; `group` is the rule by
    which pulses were grouped. `number` is the scale number needed (0: none), `wide` the same with the
    size factor of a wide beam (mode D); both may exceed the end of the scale.
    """

    mode: str
    row: ScaleRow
    text: str
    value: float
    pulses: float
    group: UseRow | None
    number: int
    size_factor: float
    wide: int

    @property
    def uncertain(self) -> bool:
        """Whether something from memory entered beside the scale table."""
        return self.size_factor > 1.0 or self.group is not None


@dataclass(frozen=True, slots=True)
class AlignmentNeed:
    """Alignment eyewear: power [W] or pulse energy [J] through 7 mm, the scale number, None beyond it.

    Of the power and the energy of a pulse train, the one that asks for more.
    """

    value: float
    unit: str
    number: int | None


def spot_area_m2(lines: Lines, line: int, distance_m: float) -> tuple[float, float]:
    """Area [m2] and larger diameter [m] of a line's beam at a distance: d63 (1/e), or the full top hat."""
    x, y = lines.beams.take(np.array([line])).diameters_m(np.array([distance_m]))
    return float(np.pi / 4.0 * x[0] * y[0]), float(max(x[0], y[0]))


def scale_number(row: ScaleRow, value: float) -> int:
    """Smallest scale number n with coefficient x 10^(n + offset) >= value, at least 0."""
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
        return [_continuous("P / A", emitted / area, wavelength, diameter, tables)]
    pulse, rate = float(lines.pulse_s[line]), float(lines.rate_hz[line])
    mode = tables.mode(pulse)
    if mode == "D":
        needs = [_continuous("Q / (t_p A)", emitted / pulse / area, wavelength, diameter, tables)]
    else:
        row = tables.scale(mode, wavelength)
        text, value, pulses, group = "Q / A", emitted / area, 1.0, None
        if row.quantity == "E":
            text, value = "Q / (t_p A)", emitted / pulse / area
        elif lines.mode[line] == TRAIN:
            text, value, pulses, group = _with_pulse_number(value, pulse, rate, wavelength, tables)
        number = scale_number(row, value)
        needs = [ScaleNeed(mode, row, text, value, pulses, group, number, 1.0, number)]
    if lines.mode[line] == TRAIN:
        needs.append(_continuous("Q f / A", emitted * rate / area, wavelength, diameter, tables))
    return needs


def _continuous(
    text: str, irradiance: float, wavelength: float, diameter_m: float, tables: EyewearTables
) -> ScaleNeed:
    """Mode D, without and with the size factor d^k of beams wider than 1 mm (d in mm, held at 15 mm)."""
    row = tables.scale("D", wavelength)
    factor = 1.0
    band = tables.use["size_exponent_glass_first"]
    if wavelength >= (band.wavelength_from_nm or 0.0):
        width = min(max(diameter_m * 1e3, tables.use["size_from"].value), tables.use["size_to"].value)
        factor = width**band.value
    number, wide = scale_number(row, irradiance), scale_number(row, irradiance * factor)
    return ScaleNeed("D", row, text, irradiance, 1.0, None, number, factor, wide)


def _with_pulse_number(
    value: float, pulse: float, rate: float, wavelength: float, tables: EyewearTables
) -> tuple[str, float, float, UseRow | None]:
    """H x N^(1/4) with N the pulses, or groups of pulses, in 5 s."""
    use, text = tables.use, "Q / A"
    low = use["count_window"].wavelength_from_nm or 0.0
    if rate <= use["count_rate_above"].value or pulse >= use["count_pulse_below"].value or wavelength < low:
        return text, value, 1.0, None
    pulses = use["count_window"].value * rate
    group = tables.group_time(wavelength)
    if group is not None and rate * group.value >= 1.0:
        text, value = f"Q f T_i / A, T_i = {group.value:g} s", value * rate * group.value
        pulses = max(1.0, use["group_count"].value / group.value)
    else:
        group = None
    text = f"{text}, times N^{use['count_exponent'].value:g} with N = {pulses:g}"
    return text, value * pulses ** use["count_exponent"].value, pulses, group


def alignment_need(lines: Lines, line: int, distance_m: float, tables: EyewearTables) -> AlignmentNeed | None:
    """Scale number of alignment eyewear after EN 208; None outside 400 to 700 nm and below 1 ns.

    A pulse is judged by its energy with the pulse number, a train also by its average power.
    """
    wavelength, use = float(lines.wavelength_nm[line]), tables.use
    rows = tables.alignment
    if not rows[0].wavelength_from_nm <= wavelength <= rows[0].wavelength_to_nm:
        return None
    beam = lines.beams.take(np.array([line]))
    aperture = np.array([1e-3 * use["en208_aperture"].value])
    through = float(lines.emitted[line] * beam.fraction(aperture, np.array([distance_m]))[0])
    if lines.mode[line] == CW:
        return _aligning_power(through, tables)
    pulse, rate = float(lines.pulse_s[line]), float(lines.rate_hz[line])
    if pulse > use["en208_split"].value:
        return _aligning_power(through / pulse, tables)
    if pulse < use["en208_shortest"].value:
        return None
    if lines.mode[line] == PULSE:
        return _aligning_energy(through, tables)
    repeated = max(1.0, rate * use["en208_pulse_window"].value)
    energy = _aligning_energy(through * repeated ** use["en208_count_exponent"].value, tables)
    power = _aligning_power(through * rate, tables)
    return max(power, energy, key=lambda n: np.inf if n.number is None else n.number)


def _aligning_power(power: float, tables: EyewearTables) -> AlignmentNeed:
    bounds = [(int(r.scale), r.max_power_w) for r in tables.alignment]
    return _aligning(power, "W", tables.use["en208_target_power"].value, bounds)


def _aligning_energy(energy: float, tables: EyewearTables) -> AlignmentNeed:
    bounds = [(int(r.scale), r.max_energy_j) for r in tables.alignment]
    return _aligning(energy, "J", tables.use["en208_target_energy"].value, bounds)


def _aligning(value: float, unit: str, target: float, bounds: list[tuple[int, float]]) -> AlignmentNeed:
    """0 where the value is within the target already, else the first number whose bound holds it."""
    slack = 1.0 + SLACK
    enough = (number for number, bound in [(0, target), *bounds] if value <= bound * slack)
    return AlignmentNeed(value, unit, next(enough, None))
