"""The eyewear tables typed a second time: the expanded EN 207 table, EN 208, and the rules of use.

EN 207: encyclopaedia article on EN 207:2017 (read), each column as its first number times ten a row.
EN 208: EN 208:2009, Tables 1 and B.1 (from memory). Rules of use: DGUV Information 203-042 (read)
unless the row says memory.
"""

from __future__ import annotations

from typing import NamedTuple

__all__ = ["ALIGNMENT", "BANDS", "BASIS", "CELLS", "MODES", "USE", "WAVELENGTHS", "Use"]

#: The 90 cells: mode, first wavelength band, LB1 to LB10 [W/m2 or J/m2].
EXPANDED = """
LB   D-uv D-vis D-ir I-uv  I-vis I-ir M-uv  M-vis  M-ir
LB1  1e-2 1e+2  1e+4  3e+2  5e-2 1e+3  3e+11 1.5e-3 1e+12
LB2  1e-1 1e+3  1e+5  3e+3  5e-1 1e+4  3e+12 1.5e-2 1e+13
LB3  1e+0 1e+4  1e+6  3e+4  5e+0 1e+5  3e+13 1.5e-1 1e+14
LB4  1e+1 1e+5  1e+7  3e+5  5e+1 1e+6  3e+14 1.5e+0 1e+15
LB5  1e+2 1e+6  1e+8  3e+6  5e+2 1e+7  3e+15 1.5e+1 1e+16
LB6  1e+3 1e+7  1e+9  3e+7  5e+3 1e+8  3e+16 1.5e+2 1e+17
LB7  1e+4 1e+8  1e+10 3e+8  5e+4 1e+9  3e+17 1.5e+3 1e+18
LB8  1e+5 1e+9  1e+11 3e+9  5e+5 1e+10 3e+18 1.5e+4 1e+19
LB9  1e+6 1e+10 1e+12 3e+10 5e+6 1e+11 3e+19 1.5e+5 1e+20
LB10 1e+7 1e+11 1e+13 3e+11 5e+7 1e+12 3e+20 1.5e+6 1e+21
"""
_HEAD, *_ROWS = (row.split() for row in EXPANDED.strip().splitlines())
#: (mode, band, scale number): largest value. I stands for I and R, printed in one column.
CELLS: dict[tuple[str, str, int], float] = {
    (*column.split("-"), number + 1): float(cell)  # type: ignore[misc]
    for number, row in enumerate(_ROWS)
    for column, cell in zip(_HEAD[1:], row[1:], strict=True)
}
#: Band ends [nm], printed 180-315, >315-1400, >1400-1e6: the upper end belongs to the band.
BANDS = {"uv": (180.0, 315.0), "vis": (315.0, 1400.0), "ir": (1400.0, 1e6)}
#: Wavelengths of each band, its ends among them.
WAVELENGTHS = {
    "uv": (180.0, 254.0, 308.0, 315.0),
    "vis": (315.001, 532.0, 1064.0, 1400.0),
    "ir": (1400.001, 2000.0, 10600.0, 1e6),
}
#: Limits behind the scale, DGUV Information 203-042, Anhang 6, Tabelle A6.1 (read).
BASIS = {
    "D": {"uv": ("E", 0.001), "vis": ("E", 10.0), "ir": ("E", 1000.0)},
    "I": {"uv": ("H", 30.0), "vis": ("H", 0.005), "ir": ("H", 100.0)},
    "R": {"uv": ("H", 30.0), "vis": ("H", 0.005), "ir": ("H", 100.0)},
    "M": {"uv": ("E", 3e10), "vis": ("H", 1.5e-4), "ir": ("E", 1e11)},
}
#: Mode of a pulse by its duration [s], DGUV Information 203-042, Tabelle 2 (read): D above 0.25,
#: I above 1e-6 to 0.25, R 1e-9 to 1e-6, M below 1e-9.
MODES = (
    *((1e-13, "M"), (1e-12, "M"), (9.99e-10, "M")),
    *((1e-9, "R"), (8e-9, "R"), (9.99e-7, "R"), (1e-6, "R")),
    *((1.001e-6, "I"), (1e-3, "I"), (0.249, "I"), (0.25, "I")),
    *((0.251, "D"), (10.0, "D"), (3e4, "D")),
)
#: RB number: transmittance from and to, largest power [W] and pulse energy [J].
ALIGNMENT = {
    1: (1e-2, 1e-1, 0.01, 2e-6),
    2: (1e-3, 1e-2, 0.1, 2e-5),
    3: (1e-4, 1e-3, 1.0, 2e-4),
    4: (1e-5, 1e-4, 10.0, 2e-3),
    5: (1e-6, 1e-5, 100.0, 2e-2),
}


class Use(NamedTuple):
    """A rule of use: its value, unit, band [nm] and how it is known."""

    value: float
    unit: str
    band: tuple[float, float] | None
    known: str


COUNTED, SIZED, VISIBLE = (400.0, 1e6), (315.0, 1e6), (400.0, 700.0)
USE = {
    "en207_scale_least": Use(1, "1", None, "read"),
    "en207_scale_greatest": Use(10, "1", None, "read"),
    "en207_scale_step": Use(10, "1", None, "read"),
    "en207_test_time": Use(5, "s", None, "read"),
    "en207_test_time_older": Use(10, "s", None, "read"),
    "en207_test_pulses": Use(50, "1", None, "read"),
    "en207_test_pulses_older": Use(100, "1", None, "read"),
    "en207_mark_y_rate": Use(25, "Hz", None, "read"),
    "average_power_mode": Use(1, "1", None, "read"),
    "pulsed_two_criteria": Use(2, "1", None, "read"),
    "count_window": Use(5, "s", COUNTED, "read"),
    "count_exponent": Use(0.25, "1", COUNTED, "read"),
    "count_rate_above": Use(1, "Hz", COUNTED, "read"),
    "count_pulse_below": Use(0.25, "s", COUNTED, "read"),
    "group_count": Use(5, "s", COUNTED, "read"),
    "group_time_400": Use(18e-6, "s", (400, 1050), "memory"),
    "group_time_1050": Use(50e-6, "s", (1050, 1400), "memory"),
    "group_time_1400": Use(1e-3, "s", (1400, 1500), "memory"),
    "group_time_1500": Use(10, "s", (1500, 1800), "memory"),
    "group_time_1800": Use(1e-3, "s", (1800, 2600), "memory"),
    "group_time_2600": Use(100e-9, "s", (2600, 1e6), "memory"),
    "m_single_peak_uv": Use(1, "1", (180, 315), "read"),
    "m_single_peak_ir": Use(1, "1", (1400, 1e6), "read"),
    "beam_share": Use(0.63, "1", None, "read"),
    "size_from": Use(1, "mm", SIZED, "read"),
    "size_to": Use(15, "mm", SIZED, "read"),
    "size_power_above": Use(10, "W", SIZED, "read"),
    "size_irradiance_above": Use(1e5, "W/m2", SIZED, "read"),
    "size_exponent_glass_first": Use(1.7, "1", SIZED, "memory"),
    "size_exponent_plastic_first": Use(1.26, "1", SIZED, "memory"),
    "size_exponent_glass_second": Use(1.1693, "1", SIZED, "memory"),
    "size_exponent_plastic_second": Use(1.2233, "1", SIZED, "memory"),
    "en208_target_power": Use(1e-3, "W", VISIBLE, "read"),
    "en208_target_power_2s": Use(0.6e-3, "W", VISIBLE, "read"),
    "en208_reaction_time_2s": Use(2, "s", VISIBLE, "read"),
    "en208_split": Use(0.2e-3, "s", VISIBLE, "read"),
    "en208_shortest": Use(1e-9, "s", VISIBLE, "read"),
    # RB1 passes at most a tenth of its 2e-6 J.
    "en208_target_energy": Use(2e-7, "J", VISIBLE, "memory"),
    "en208_pulse_window": Use(10, "s", VISIBLE, "read"),
    "en208_count_exponent": Use(0.25, "1", VISIBLE, "read"),
    "en208_aperture": Use(7, "mm", VISIBLE, "read"),
    "en12254_scale_greatest": Use(10, "1", None, "memory"),
    "en12254_test_time": Use(100, "s", None, "read"),
    "en12254_mean_power": Use(100, "W", None, "memory"),
    "en12254_pulse_energy": Use(30, "J", None, "memory"),
}
