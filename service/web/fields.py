"""The fields of the form: names, kinds, how many there may be, and what pages call them."""

from __future__ import annotations

from service.contract.request import MAX_LINES, MAX_PAIRS

__all__ = [
    "ADDRESS_VERSION",
    "BEAM_NUMBERS",
    "CHANGES",
    "CHOICES",
    "EMISSION",
    "EMISSION_NUMBERS",
    "LINE_FIELDS",
    "MODE_NAMES",
    "PARTS",
    "TOP_NUMBERS",
    "TOP_TEXT",
    "field_name",
    "label_of",
]

ADDRESS_VERSION = "1"

TOP_TEXT = ("label", "rules", "basis")
TOP_NUMBERS = ("exposure_s", "distance_m")
CHOICES = {
    "mode": ("cw", "pulse", "train"),
    "profile": ("gaussian", "tophat"),
    "level": ("1/e2", "1/e"),
    "diameter_at": ("waist", "exit"),
}
EMISSION = {
    "cw": ("power_w",),
    "pulse": ("energy_j", "pulse_s"),
    "train": ("energy_j", "average_power_w", "pulse_s", "rate_hz"),
}
EMISSION_NUMBERS = ("power_w", "energy_j", "average_power_w", "pulse_s", "rate_hz")
BEAM_NUMBERS = ("diameter_mm", "diameter_y_mm", "divergence_mrad", "divergence_y_mrad", "waist_m")
LINE_NUMBERS = ("wavelength_nm", *EMISSION_NUMBERS, *BEAM_NUMBERS, "subtense_mrad")
LINE_FIELDS = (
    "wavelength_nm",
    "mode",
    *EMISSION_NUMBERS,
    "profile",
    *BEAM_NUMBERS[:4],
    "level",
    "waist_m",
    "diameter_at",
    "subtense_mrad",
)
MODE_NAMES = {"cw": "continuous wave", "pulse": "a single pulse", "train": "a pulse train"}
PAIR_FIELDS = ("pair_name", "pair_ranges", "pair_light_percent")
WINDOW_FIELDS = ("window_name", "window_distance_m", "window_density")
#: Repeated parts of the form: their fields, which of those are numbers, the least and most there may be.
PARTS = {
    "lines": (LINE_FIELDS, LINE_NUMBERS, 1, MAX_LINES),
    "pairs": (PAIR_FIELDS, PAIR_FIELDS[2:], 0, MAX_PAIRS),
    "windows": (WINDOW_FIELDS, WINDOW_FIELDS[1:], 0, MAX_PAIRS),
}
CHANGES = {
    "add": ("lines", 1),
    "remove": ("lines", -1),
    "add-pair": ("pairs", 1),
    "remove-pair": ("pairs", -1),
    "add-window": ("windows", 1),
    "remove-window": ("windows", -1),
}
LABELS = {
    "label": "Name of this laser",
    "rules": "Rule set",
    "basis": "Where the figures come from",
    "exposure_s": "Exposure duration",
    "distance_m": "Viewing distance",
    "wavelength_nm": "Wavelength",
    "power_w": "Power",
    "energy_j": "Energy of one pulse",
    "average_power_w": "Average power",
    "pulse_s": "Pulse duration",
    "rate_hz": "Repetition rate",
    "diameter_mm": "Beam diameter",
    "diameter_y_mm": "Diameter, other axis",
    "divergence_mrad": "Divergence",
    "divergence_y_mrad": "Divergence, other axis",
    "protection": "Protection at hand",
    "waist_m": "Waist position",
    "subtense_mrad": "Source subtense",
    "pair_name": "Name of the pair",
    "pair_ranges": "Ranges of the pair",
    "pair_light_percent": "Luminous transmittance",
    "window_name": "Name of the window",
    "window_distance_m": "Distance of the window",
    "window_density": "Optical density of the window",
}


def label_of(name: str, lines: int) -> str:
    """What the page calls a field, with the number of its line where there are several."""
    base, _, number = name.rpartition("-")
    if base.startswith(("pair_", "window_")):
        return f"{LABELS[base]} {number}"
    if base in LABELS:
        return f"{LABELS[base]} (line {number})" if lines > 1 else LABELS[base]
    return LABELS.get(name, name)


def field_name(name: str, line: int) -> str:
    """Form field of a line, counted from 1."""
    return f"{name}-{line}"
