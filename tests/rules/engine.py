"""What the checks of this folder share: the CSV files read plainly, and the engine asked in batches."""

from __future__ import annotations

import csv
import tomllib
from functools import cache
from pathlib import Path
from typing import NamedTuple

import numpy as np

from service.rules.compiled import CompiledRules
from service.rules.ruleset import load_all
from service.rules.tables import Row

DATA = Path(__file__).parents[2] / "data"
ICNIRP, EU, IEC, ANSI = "icnirp-2013", "eu-2006-25", "iec-60825-1-2014", "ansi-z136-1-2014"
RULES = (ICNIRP, EU, IEC, ANSI)
TARGETS = ("eye", "skin")
TABLES = ("limits", "factors", "apertures", "durations", "repetition")
#: Ends of the whole range, all sets: 180 nm to 1 mm, 100 fs to 30 000 s.
LAST_NM, LAST_S = 1e6, 3e4


class Held(NamedTuple):
    """One limit row that the engine says holds for an exposure, and the aperture it uses."""

    row: str
    tissue: str
    effect: str
    limit_j_m2: float
    aperture: str
    aperture_mm: float


def table(rules: str, name: str) -> list[dict[str, str]]:
    """One CSV file as dicts of text, read with the standard library alone."""
    path = DATA / "rules" / ("additivity.csv" if name == "additivity" else f"{rules}/{name}.csv")
    with path.open(encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


def head(rules: str) -> dict:
    return tomllib.loads((DATA / "rules" / rules / "ruleset.toml").read_text(encoding="utf-8"))


def number(text: str) -> float | str | None:
    """A cell as a number, as the name of a break time, or None where it is blank."""
    if not text:
        return None
    return text if text in ("T1", "T2", "alpha_max") else float(text)


@cache
def compiled(rules: str) -> CompiledRules:
    return CompiledRules(load_all(DATA)[rules])


def named(rows: tuple[Row, ...], name: str) -> int:
    """Number of the row with this name."""
    return [r.row for r in rows].index(name)


def row_numbers(rules: str, target: str, wavelength_nm, time_s, subtense_mrad):
    """(conditions, row numbers by exposure and slot, -1 where empty): three equal 1-d arrays in."""
    engine = compiled(rules)
    wavelength, time, alpha = (np.asarray(a, dtype=float) for a in (wavelength_nm, time_s, subtense_mrad))
    at = engine.conditions(wavelength, alpha)
    line = np.arange(len(wavelength))
    return at, engine.grid.rows(target, engine.cells(at, line, time))


def held(rules: str, target: str, points: list[tuple[float, float, float]]) -> list[list[Held]]:
    """Rows that hold at each point (wavelength [nm], time [s], subtense [mrad])."""
    engine = compiled(rules)
    wavelength, time, alpha = (np.array(column, dtype=float) for column in zip(*points, strict=True))
    at, rows = row_numbers(rules, target, wavelength, time, alpha)
    line, slot = np.nonzero(rows >= 0)
    row = rows[line, slot]
    limit = engine.values(row, at, line, time[line])
    apertures = engine.apertures.rows(row, wavelength[line], time[line])
    diameter = engine.apertures(row, wavelength[line], time[line]) * 1e3
    found: list[list[Held]] = [[] for _ in points]
    for k, n in enumerate(line):
        r = engine.rules.limits[row[k]]
        aperture = engine.rules.apertures[apertures[k]].row
        found[n].append(Held(r.row, r.tissue, r.effect, float(limit[k]), aperture, float(diameter[k])))
    return found


def limit(
    rules: str, wavelength_nm: float, time_s: float, alpha_mrad: float = 1.5, tissue: str = "retina",
    effect: str = "thermal",
) -> float:  # fmt: skip
    """The one limit [J/m2] of a tissue and effect; the smallest where two rows share a boundary."""
    target = "skin" if tissue == "skin" else "eye"
    rows = held(rules, target, [(wavelength_nm, time_s, alpha_mrad)])[0]
    values = [h.limit_j_m2 for h in rows if (h.tissue, h.effect) == (tissue, effect)]
    assert values, f"no {tissue} {effect} row at {wavelength_nm} nm, {time_s} s"
    return min(values)


def factor(rules: str, name: str, x: float) -> float:
    return float(compiled(rules).factors[name](np.array([x]))[0])


def aperture_mm(rules: str, wavelength_nm: float, time_s: float, tissue: str) -> float:
    target = "skin" if tissue == "skin" else "eye"
    rows = held(rules, target, [(wavelength_nm, time_s, 1.5)])[0]
    return next(h.aperture_mm for h in rows if h.tissue == tissue)
