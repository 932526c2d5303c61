"""What the checks of the class schemes share: CSV files read plainly, and the engine asked in batches."""

from __future__ import annotations

import csv
import tomllib
from functools import cache
from typing import NamedTuple

import numpy as np

from service.rules.classes import CompiledScheme, compiled_schemes
from tests.rules.engine import DATA

IEC, US = "iec-60825-1-2014", "us-21cfr1040"
SCHEMES = (IEC, US)
TABLES = ("factors", "limits", "measurement", "repetition", "timebases")

#: Wavelength [nm], time [s], subtense [mrad].
Point = tuple[float, float, float]


class Held(NamedTuple):
    """One limit row that the engine says holds; its limit as a dose in `unit` (J or J/m2)."""

    row: str
    tissue: str
    effect: str
    unit: str
    dose: float


def table(scheme: str, name: str) -> list[dict[str, str]]:
    """One CSV file as dicts of text, read with the standard library alone."""
    with (DATA / "classes" / scheme / f"{name}.csv").open(encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


def head(scheme: str) -> dict:
    return tomllib.loads((DATA / "classes" / scheme / "scheme.toml").read_text(encoding="utf-8"))


@cache
def compiled(scheme: str) -> CompiledScheme:
    return compiled_schemes(DATA)[scheme]


def held(scheme: str, target: str, points: list[Point]) -> list[list[Held]]:
    """Rows of one class's limits that hold at each point."""
    engine = compiled(scheme)
    wavelength, time, alpha = (np.array(column, dtype=float) for column in zip(*points, strict=True))
    at = engine.conditions(engine.printed(wavelength), alpha)
    line = np.arange(len(points))
    rows = engine.grid.rows(target, engine.cells(at, line, time))
    line, slot = np.nonzero(rows >= 0)
    row = rows[line, slot]
    dose = engine.values(row, at, line, time[line])
    found: list[list[Held]] = [[] for _ in points]
    for k, n in enumerate(line):
        r = engine.scheme.limits[row[k]]
        unit = "J/m2" if engine.per_area[row[k]] else "J"
        found[n].append(Held(r.row, r.tissue, r.effect, unit, float(dose[k])))
    return found


def dose(
    scheme: str, target: str, wavelength_nm: float, time_s: float, alpha_mrad: float = 1.5,
    effect: str | None = None, anterior: bool = False,
) -> float:  # fmt: skip
    """The smallest limit of a class as a dose [J or J/m2]; of one effect where it is named."""
    rows = held(scheme, target, [(wavelength_nm, time_s, alpha_mrad)])[0]
    values = [h.dose for h in rows if effect in (None, h.effect) and (h.tissue == "anterior") == anterior]
    assert values, f"no limit of Class {target} at {wavelength_nm} nm, {time_s} s"
    return min(values)


def factor(scheme: str, name: str, x: float) -> float:
    return float(compiled(scheme).factors[name](np.array([x]))[0])


def measured(scheme: str, condition: str, wavelength_nm: float, time_s: float) -> tuple[str, float, float]:
    """Row, aperture [mm] and distance [m] of a condition; row "" where there is none."""
    engine = compiled(scheme)
    aperture, distance, number = engine.measured(condition, np.array([wavelength_nm]), np.array([time_s]))
    name = "" if number[0] < 0 else engine.scheme.measurement[number[0]].row
    return name, 1e3 * float(aperture[0]), float(distance[0])
