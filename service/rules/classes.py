"""Classification schemes: accessible emission limits, measurement conditions and time bases."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from service.rules.additivity import BandsThatAdd
from service.rules.limit_set import Growth, LimitSet, check_keys, limit_set_parts, take
from service.rules.limits import LimitTable
from service.rules.tables import Row, TableError, read_rows, read_sources, read_toml

__all__ = [
    "ClassRule",
    "ClassScheme",
    "CompiledScheme",
    "MeasurementRow",
    "TimeBaseRow",
    "compiled_schemes",
]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

LAST_NM, LAST_S = 1e6, 3e4
DEFAULT_SCHEME = "iec-60825-1-2014"
TABLES = ("factors.csv", "limits.csv", "measurement.csv", "repetition.csv", "timebases.csv")


@dataclass(frozen=True, slots=True)
class MeasurementRow(Row):
    """One measurement condition: aperture coefficient_mm x t^time_power [mm] at distance_m."""

    condition: str
    wavelength_from_nm: float
    wavelength_to_nm: float
    time_from_s: float
    time_to_s: float
    coefficient_mm: float
    time_power: float
    distance_m: float


@dataclass(frozen=True, slots=True)
class TimeBaseRow(Row):
    """Time base [s] of the limits of one class in a wavelength band."""

    target: str
    wavelength_from_nm: float
    wavelength_to_nm: float
    duration_s: float


@dataclass(frozen=True, slots=True)
class ClassRule:
    """When a class holds.

    `limits` names the limits that must not be exceeded; under every condition, or, where
    `aided_limits` is given, under the unaided condition alone while the aided one stays below
    `aided_limits`. `wavelength_nm`: a line must lie in this band for the class to be available.
    The last class has no limits.
    """

    name: str
    limits: str | None
    aided_limits: str | None
    wavelength_nm: tuple[float, float] | None


@dataclass(frozen=True, slots=True, kw_only=True)
class ClassScheme(LimitSet):
    """A published scheme of hazard classes.

    `fallback` gives the limits used where a class has none; no class but the last may exceed the
    limits named by `ceiling`.
    """

    ceiling: str
    classes: tuple[ClassRule, ...]
    fallback: dict[str, str]
    measurement: tuple[MeasurementRow, ...]
    time_bases: tuple[TimeBaseRow, ...]
    remarks: tuple[str, ...]


def _growth(path: Path, entry: dict[str, Any] | None) -> Growth | None:
    if entry is None:
        return None
    check_keys(path, "growth", entry, ("band", "known", "locator", "source", "symbol", "until_s"))
    bands = tuple(
        (float(b["wavelength_nm"][0]), float(b["wavelength_nm"][1]), b.get("origin"), float(b["per"]))
        for b in entry["band"]
    )
    texts = {key: entry[key] for key in ("symbol", "source", "locator", "known")}
    return Growth(until_s=float(entry["until_s"]), bands=bands, **texts)


def load_scheme(folder: Path, additivity: Path, sources: dict[str, Any]) -> ClassScheme:
    """Read one scheme. Raises TableError on anything unknown, missing or inconsistent."""
    path = folder / "scheme.toml"
    head = read_toml(path)
    parts = limit_set_parts(folder, "scheme.toml", TABLES, head, additivity, sources)
    classes = []
    for entry in take(path, head, "class", list):
        rule = {"limits": None, "aided_limits": None, "wavelength_nm": None, **entry}
        check_keys(path, "class", rule, ("aided_limits", "limits", "name", "wavelength_nm"))
        band = rule["wavelength_nm"]
        rule["wavelength_nm"] = None if band is None else (float(band[0]), float(band[1]))
        classes.append(ClassRule(**rule))
    ceiling = take(path, head, "ceiling", dict)
    check_keys(path, "ceiling", ceiling, ("known", "limits", "locator", "source"))
    scheme = ClassScheme(
        **parts,
        ceiling=ceiling["limits"],
        classes=tuple(classes),
        fallback=take(path, head, "fallback", dict),
        remarks=tuple(take(path, head, "remarks", list)),
        growth=_growth(path, head.pop("growth", None)),
        measurement=read_rows(folder / "measurement.csv", MeasurementRow, sources),
        time_bases=read_rows(folder / "timebases.csv", TimeBaseRow, sources),
    )
    if head:
        raise TableError(path, 1, f"unknown keys {sorted(head)}")
    targets = {row.target for row in scheme.limits}
    named = {c for rule in classes for c in (rule.limits, rule.aided_limits) if c} | {
        scheme.ceiling,
        *scheme.fallback.values(),
    }
    if not named <= targets or not targets <= {row.target for row in scheme.time_bases}:
        raise TableError(path, 1, "a class names limits that have no rows or no time base")
    if classes[-1].limits is not None or any(rule.limits is None for rule in classes[:-1]):
        raise TableError(path, 1, "the last class, and no other, has no limits")
    return scheme


def _within(x: Floats, low: float, high: float, last: float) -> NDArray[np.bool_]:
    """low <= x < high; the last band includes its end."""
    return (x >= low) & ((x < high) | (high >= last))


class CompiledScheme(LimitTable):
    """One scheme ready for arrays. Raises TableError where its tables do not fit together."""

    def __init__(self, scheme: ClassScheme) -> None:
        super().__init__(scheme)
        self.scheme = scheme
        self.adding = BandsThatAdd(scheme.additivity, scheme.path / "additivity.csv")
        self.per_area = np.array([row.quantity in "HE" for row in scheme.limits])
        tissues = {"retina": 1, "anterior": 2}
        self.tissue = np.array([tissues.get(row.tissue, 0) for row in scheme.limits])
        self.conditions_named = tuple(dict.fromkeys(row.condition for row in scheme.measurement))
        self.targets = self.grid.targets

    def time_base(self, target: str, wavelength_nm: Floats) -> Floats:
        """Time base [s] of a class's limits for each wavelength; NaN where the class has none."""
        seconds = np.full(wavelength_nm.shape, np.nan)
        for row in (r for r in self.scheme.time_bases if r.target == target):
            inside = _within(wavelength_nm, row.wavelength_from_nm, row.wavelength_to_nm, LAST_NM)
            seconds[inside] = row.duration_s
        return seconds

    def measured(self, condition: str, wavelength_nm: Floats, time_s: Floats) -> tuple[Floats, Floats, Ints]:
        """Aperture [m], distance [m] and row number of a condition; row -1 where there is none."""
        aperture, distance = np.zeros(wavelength_nm.shape), np.zeros(wavelength_nm.shape)
        number = np.full(wavelength_nm.shape, -1, dtype=np.intp)
        for k, row in enumerate(self.scheme.measurement):
            if row.condition != condition:
                continue
            inside = _within(wavelength_nm, row.wavelength_from_nm, row.wavelength_to_nm, LAST_NM)
            inside &= _within(time_s, row.time_from_s, row.time_to_s, LAST_S)
            aperture[inside] = 1e-3 * row.coefficient_mm * time_s[inside] ** row.time_power
            distance[inside], number[inside] = row.distance_m, k
        return aperture, distance, number


@lru_cache(maxsize=4)
def compiled_schemes(data: Path) -> dict[str, CompiledScheme]:
    """Every scheme under ``data/classes``, the default first. Raises TableError."""
    sources = read_sources(data / "sources.toml")
    folders = sorted(p.parent for p in (data / "classes").glob("*/scheme.toml"))
    folders.sort(key=lambda p: p.name != DEFAULT_SCHEME)
    additivity = data / "rules" / "additivity.csv"
    return {p.name: CompiledScheme(load_scheme(p, additivity, sources)) for p in folders}
