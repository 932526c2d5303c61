"""Columns to lines without a request each, for the rows that arrays alone show to be valid."""

from __future__ import annotations

from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from service.assess.lines import CW, MODES, PULSE, TRAIN, Lines
from service.bulk.flat import absent
from service.contract.beam import LEAST_MRAD
from service.contract.request import EvaluationRequest
from service.optics.beams import SQRT2, Beams

__all__ = ["quick_lines", "ranges"]

Floats = NDArray[np.float64]
Ranges = dict[str, tuple[float, float]]
#: Which emission columns a mode must have; the others must be empty.
NEEDS = {CW: ("power_w",), PULSE: ("energy_j", "pulse_s"), TRAIN: ("pulse_s", "rate_hz")}
EMISSION = ("power_w", "energy_j", "pulse_s", "rate_hz", "average_power_w")
#: Numbers of rows that are read as requests: fibre ends, open resonators, what is said of viewing.
APART = (
    "distance_m",
    "visibility_km",
    "mode_field_diameter_um",
    "numerical_aperture",
    "core_diameter_um",
    "output_mirror_reflectance",
)
#: The parts of a request that columns hold.
MODELS = ("Beam", "Cw", "Line", "Pulse", "Train", "Viewing")
CHOICES = {"profile": ("gaussian", "tophat"), "level": ("1/e2", "1/e"), "diameter_at": ("waist", "exit")}


@cache
def ranges() -> Ranges:
    """Allowed range of every number of a request by name, as its published schema says."""
    schema = EvaluationRequest.model_json_schema()
    found: Ranges = {}
    for part in (schema, *(schema["$defs"][model] for model in MODELS)):
        for name, field in part.get("properties", {}).items():
            number = next((f for f in (field, *field.get("anyOf", ())) if f.get("type") == "number"), None)
            if number is not None and "minimum" in number:
                found[name] = (number["minimum"], number["maximum"])
    return found


def quick_lines(part: dict[str, NDArray[Any]], allowed: Ranges) -> tuple[NDArray[np.bool_], Lines]:
    """Lines of a table, and the rows that are sure to be valid; the other rows' lines mean nothing.

    A row that is not plain (text where a number is expected, a diameter at the exit away from the waist, a
    viewing distance, an angle next to nothing, anything out of range) is left to be read as a request.

    Parameters
    ----------
    part : columns of one length by name, numbers as float64 where they are numbers
    allowed : ranges of the numbers
    """
    count = len(next(iter(part.values())))
    ok = np.ones(count, dtype=bool)
    blank = np.full(count, np.nan)
    numbers: dict[str, Floats] = {}

    def number(name: str) -> Floats:
        if name not in numbers:
            column = part.get(name, blank)
            if column.dtype == object:
                column, plain = _plain_numbers(column)
                ok[:] &= plain
            numbers[name] = column
        return numbers[name]

    def within(name: str, values: Floats, needed: bool) -> None:
        low, high = allowed[name]
        inside = (values >= low) & (values <= high)
        ok[:] &= inside if needed else inside | np.isnan(values)

    chosen = {name: _choices(part.get(name), names, count, ok) for name, names in CHOICES.items()}
    mode = _choices(part.get("mode"), MODES, count, ok, needed=True)
    for name in EMISSION:
        within(name, number(name), needed=False)
    for kind, needed in NEEDS.items():
        mine = mode == kind
        for name in EMISSION:
            given = ~np.isnan(number(name))
            if kind == TRAIN and name in ("energy_j", "average_power_w"):
                continue
            ok &= ~mine | (given == (name in needed))
    by_power = ~np.isnan(number("average_power_w"))
    ok &= (mode != TRAIN) | (by_power != ~np.isnan(number("energy_j")))

    emitted = np.where(mode == CW, number("power_w"), number("energy_j"))
    rate = np.where(mode == TRAIN, number("rate_hz"), 1.0)
    with np.errstate(over="ignore", under="ignore"):
        emitted = np.where((mode == TRAIN) & by_power, number("average_power_w") / rate, emitted)
    low, high = allowed["energy_j"]
    ok &= (mode != TRAIN) | ((emitted >= low) & (emitted <= high))

    wavelength, exposure = number("wavelength_nm"), number("exposure_s")
    within("wavelength_nm", wavelength, needed=True)
    within("exposure_s", exposure, needed=False)
    subtense, waist = _default(number("subtense_mrad"), 1.5), _default(number("waist_m"), 0.0)
    within("subtense_mrad", subtense, needed=True)
    within("waist_m", waist, needed=True)
    ok &= (chosen["diameter_at"] == 0) | (waist == 0.0)
    for name in APART:
        ok &= np.isnan(number(name))
    axes = []
    flat = chosen["profile"] == 1
    to_1e = np.where(flat | (chosen["level"] == 1), 1e-3, 1e-3 / SQRT2)
    for name in ("diameter_mm", "divergence_mrad"):
        x = number(name)
        for values in (x, _default(number(name.replace("_m", "_y_m")), x)):
            within(name, values, needed=True)
            if name == "divergence_mrad":
                ok &= (values == 0.0) | (values >= LEAST_MRAD)
            axes.append(values * to_1e)
    dx, dy, px, py = axes
    beams = Beams.with_waist(flat, dx, dy, px, py, waist)
    ones = np.ones(count)
    pulse = np.where(mode == CW, ones, number("pulse_s"))
    return ok, Lines(np.arange(count), wavelength, mode, emitted, pulse, rate, exposure, subtense, beams)


def _default(values: Floats, instead: float | Floats) -> Floats:
    return np.where(np.isnan(values), instead, values)


def _plain_numbers(column: NDArray[Any]) -> tuple[Floats, NDArray[np.bool_]]:
    """A column of objects as floats, empty cells as NaN; which cells are a number or empty."""
    plain = np.array([c is None or (isinstance(c, int | float) and not isinstance(c, bool)) for c in column])
    values = [float("nan") if c is None or not p else float(c) for c, p in zip(column, plain, strict=True)]
    return np.array(values, dtype=np.float64), plain


def _choices(
    column: NDArray[Any] | None,
    names: tuple[str, ...],
    count: int,
    ok: NDArray[np.bool_],
    needed: bool = False,
) -> NDArray[np.intp]:
    """Number of the name in each cell, 0 where empty; cells with another value are no longer ok."""
    if column is None:
        ok &= not needed
        return np.zeros(count, dtype=np.intp)
    found = np.full(count, -1, dtype=np.intp)
    for k, name in enumerate(names):
        found[column == name] = k
    if not needed:
        found[[absent(c) for c in column]] = 0
    ok &= found >= 0
    return np.maximum(found, 0)
