"""The inputs of an answer as rows of name and value: every one, none left out."""

from __future__ import annotations

from typing import Any

from service.contract.problem import UNITS
from service.web.fields import FIELDS
from service.web.numbers import typeset

__all__ = ["SHOWN_UNITS", "understood"]

Rows = list[tuple[str, str]]

NAMES = {
    "basis": "Where the figures come from",
    "wavelength_nm": "Wavelength",
    "mode": "Emission",
    "power_w": "Power",
    "energy_j": "Energy of one pulse",
    "average_power_w": "Average power",
    "pulse_s": "Pulse duration",
    "rate_hz": "Repetition rate",
    "profile": "Beam",
    "diameter_mm": "Beam diameter",
    "divergence_mrad": "Divergence, full angle",
    "level": "Diameter and divergence at",
    "diameter_at": "Diameter given at",
    "waist_m": "Waist, ahead of the exit",
    "subtense_mrad": "Source subtense",
    "exposure_s": "Exposure duration",
    "distance_m": "Distance",
    "visibility_km": "Visibility",
    "objective_mm": "Objective of the optical aid",
    "magnification": "Its magnification",
    "core_diameter_um": "Core diameter",
    "mode_field_diameter_um": "Mode field diameter",
    "output_mirror_reflectance": "Resonator open, output mirror reflectance",
    "from_nm": "from",
    "to_nm": "to",
}
WORDS = {
    "basis": dict(FIELDS["basis"].choices),
    "mode": {"cw": "continuous wave", "pulse": "single pulse", "train": "pulse train"},
    "level": {"1/e2": "1/e² of the peak", "1/e": "1/e of the peak"},
    "diameter_at": {"waist": "the waist", "exit": "the exit"},
    "profile": {
        "gaussian": "Gaussian",
        "tophat": "top hat",
        "fibre_single_mode": "end of a single-mode fibre",
        "fibre_multimode": "end of a multimode fibre",
    },
}
SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
SHOWN_UNITS = {"um": "µm", "degrees": "°"}


def understood(inputs: dict[str, Any], titles: dict[str, str]) -> list[tuple[str, Rows]]:
    """Parts of the setup, each with names and values.

    Parameters
    ----------
    inputs : the inputs that an answer echoes
    titles : title of every rule set by id
    """
    lines = inputs["lines"]
    exposure = inputs.get("exposure_s")
    general = [
        ("Name", inputs.get("label") or "not named"),
        ("Rule set", titles[inputs["rules"]]),
        (
            "Exposure duration",
            "conventional, line by line" if exposure is None else _value("exposure_s", exposure),
        ),
    ]
    parts = [("Laser", [*general, *_rows({"basis": inputs.get("basis")})])]
    for k, line in enumerate(lines):
        parts.append((f"Line {k + 1}" if len(lines) > 1 else "Emission and beam", _rows(line)))
    for k, element in enumerate(inputs.get("bench", [])):
        parts.append((f"Element {k + 1} of the bench", _rows(element)))
    viewing = _rows(inputs.get("viewing", {}))
    if viewing:
        parts.append(("Viewing", viewing))
    for k, pair in enumerate(inputs.get("eyewear", [])):
        ranges = [", ".join(f"{n} {v}" for n, v in _rows(r)) for r in pair["ranges"]]
        rows = _rows({n: v for n, v in pair.items() if n != "ranges"})
        parts.append((f"Pair {k + 1}", [*rows, *(("Range", text) for text in ranges)]))
    for k, window in enumerate(inputs.get("windows", [])):
        parts.append((f"Window {k + 1}", _rows(window)))
    return parts


def _rows(entry: dict[str, Any]) -> Rows:
    """Every field of an entry and of what it holds."""
    rows: Rows = []
    for name, value in entry.items():
        if isinstance(value, dict):
            rows += _rows(value)
        elif value is not None:
            rows.append((_name(name), _value(name, value)))
    return rows


def _unit(name: str) -> str:
    unit = UNITS.get(name.rpartition("_")[2], "") if "_" in name else ""
    return SHOWN_UNITS.get(unit, unit)


def _name(name: str) -> str:
    if name in NAMES:
        return NAMES[name]
    words = (name.rpartition("_")[0] if _unit(name) else name).replace("_", " ")
    return words[:1].upper() + words[1:]


def _value(name: str, value: Any) -> str:
    if isinstance(value, list):
        return f"{' × '.join(map(typeset, value))} {_unit(name)}".rstrip()
    if isinstance(value, bool):
        return "yes" if value else "no"
    if not isinstance(value, int | float):
        return WORDS.get(name, {}).get(str(value), str(value))
    return f"{typeset(value)} {_unit(name)}".rstrip()
