"""Classification schemes: accessible emission limits, measurement conditions and time bases."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from service.rules.additivity import BandsThatAdd
from service.rules.class_checks import check_scheme, check_source, check_texts, growth_bands
from service.rules.class_scheme import (
    BAND_ENDS,
    FIRST_NM,
    LAST_NM,
    LAST_S,
    UNAIDED,
    ClassRule,
    ClassScheme,
    MeasurementRow,
    TimeBaseRow,
)
from service.rules.limit_set import Growth, check_keys, limit_set_parts, numbers_ascend, take
from service.rules.limits import LimitTable
from service.rules.tables import TableError, read_rows, read_sources, read_toml

__all__ = [
    "UNAIDED",
    "ClassRule",
    "ClassScheme",
    "CompiledScheme",
    "MeasurementRow",
    "TimeBaseRow",
    "compiled_schemes",
    "load_scheme",
]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

DEFAULT_SCHEME = "iec-60825-1-2014"
TABLES = ("factors.csv", "limits.csv", "measurement.csv", "repetition.csv", "timebases.csv")


def _growth(path: Path, entry: dict[str, Any] | None, sources: dict[str, Any]) -> Growth | None:
    if entry is None:
        return None
    check_keys(path, "growth", entry, ("band", "known", "locator", "source", "symbol", "until_s"))
    check_source(path, "growth", entry, sources)
    check_texts(path, "growth.symbol", [entry["symbol"]])
    (_, until) = numbers_ascend(path, "0 and growth.until_s", [0, entry["until_s"]])
    texts = {key: entry[key] for key in ("symbol", "source", "locator", "known")}
    return Growth(until_s=until, bands=growth_bands(path, entry["band"]), **texts)


def _class(path: Path, entry: Any) -> ClassRule:
    if not isinstance(entry, dict):
        raise TableError(path, 1, f"class {entry!r} is not a table")
    rule = {"limits": None, "aided_limits": None, "wavelength_nm": None, **entry}
    check_keys(path, "class", rule, ("aided_limits", "limits", "name", "wavelength_nm"))
    check_texts(
        path, "class", (rule["name"], *(rule[k] for k in ("limits", "aided_limits") if rule[k] is not None))
    )
    if rule["wavelength_nm"] is not None:
        rule["wavelength_nm"] = numbers_ascend(path, "class.wavelength_nm", rule["wavelength_nm"])
    return ClassRule(**rule)


def load_scheme(folder: Path, additivity: Path, sources: dict[str, Any]) -> ClassScheme:
    """Read one scheme. Raises TableError on anything unknown, missing or inconsistent."""
    path = folder / "scheme.toml"
    head = read_toml(path)
    parts = limit_set_parts(folder, "scheme.toml", TABLES, head, additivity, sources)
    band_ends = take(path, head, "band_ends", str)
    if band_ends not in BAND_ENDS:
        raise TableError(path, 1, f"band_ends is {band_ends!r}, expected one of {', '.join(BAND_ENDS)}")
    classes = tuple(_class(path, entry) for entry in take(path, head, "class", list))
    ceiling = take(path, head, "ceiling", dict)
    check_keys(path, "ceiling", ceiling, ("known", "limits", "locator", "source"))
    check_source(path, "ceiling", ceiling, sources)
    fallback, remarks = take(path, head, "fallback", dict), take(path, head, "remarks", list)
    check_texts(path, "fallback, remarks or ceiling", [*fallback.values(), *remarks, ceiling["limits"]])
    scheme = ClassScheme(
        **parts,
        ceiling=ceiling["limits"],
        band_ends=band_ends,
        classes=classes,
        fallback=fallback,
        remarks=tuple(remarks),
        growth=_growth(path, head.pop("growth", None), sources),
        measurement=read_rows(folder / "measurement.csv", MeasurementRow, sources),
        time_bases=read_rows(folder / "timebases.csv", TimeBaseRow, sources),
    )
    if head:
        raise TableError(path, 1, f"unknown keys {sorted(head)}")
    check_scheme(scheme)
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
        self._compile()

    def printed(self, wavelength_nm: Floats) -> Floats:
        """Wavelengths [nm] at which to read this scheme's tables, for wavelengths of lines [nm].

        All tables are read with the lower end of a band included. Where a scheme prints the upper end
        as included, a wavelength is read just below itself: exact on every boundary, and elsewhere
        within one unit in the last place.
        """
        if self.scheme.band_ends == "lower":
            return wavelength_nm
        return np.maximum(np.nextafter(wavelength_nm, 0.0), FIRST_NM)

    def time_base_row(self, target: str, wavelength_nm: float) -> TimeBaseRow:
        """The row that `time_base` takes at a wavelength [nm]. Raises LookupError where there is none."""
        for row in (r for r in self.scheme.time_bases if r.target == target):
            x = np.array([wavelength_nm])
            if _within(x, row.wavelength_from_nm, row.wavelength_to_nm, LAST_NM)[0]:
                return row
        raise LookupError(f"no time base of {target} at {wavelength_nm} nm")

    def time_base(self, target: str, wavelength_nm: Floats) -> Floats:
        """Time base [s] of a class's limits for each wavelength as printed; NaN where the class has none."""
        seconds = np.full(wavelength_nm.shape, np.nan)
        for row in (r for r in self.scheme.time_bases if r.target == target):
            inside = _within(wavelength_nm, row.wavelength_from_nm, row.wavelength_to_nm, LAST_NM)
            seconds[inside] = row.duration_s
        return seconds

    def measured(self, condition: str, wavelength_nm: Floats, time_s: Floats) -> tuple[Floats, Floats, Ints]:
        """Aperture [m], distance [m] and row number of a condition; row -1 where there is none."""
        w = np.searchsorted(self._measured_nm, wavelength_nm, "right")
        t = np.searchsorted(self._measured_s, time_s, "right")
        number = self._measured[condition][w, t]
        aperture: Floats = self._measured_m[number]
        power = self._measured_power[number]
        k = power.nonzero()[0]
        if k.size:
            aperture[k] *= time_s[k] ** power[k]
        return aperture, self._measured_at_m[number], number

    def rows(self, target: Ints, cell: Ints, regular: Ints) -> NDArray[np.int16]:
        """Row numbers by cell and slot, -1 where empty; `target` indexes `targets` for each exposure."""
        found: NDArray[np.int16] = self._rows[target, cell + regular * self.grid.kind_stride]
        return found

    def _compile(self) -> None:
        """Measurement rows by band of wavelength and time, and the limit rows of all targets in one table."""
        rows = self.scheme.measurement
        self._measured_nm = np.unique(
            [r.wavelength_from_nm for r in rows] + [r.wavelength_to_nm for r in rows]
        )
        self._measured_s = np.unique([r.time_from_s for r in rows] + [r.time_to_s for r in rows])
        low_nm, low_s = np.r_[-np.inf, self._measured_nm], np.r_[-np.inf, self._measured_s]
        self._measured = {}
        for condition in self.conditions_named:
            number = self._measured[condition] = np.full((len(low_nm), len(low_s)), -1, dtype=np.intp)
            for k, row in ((k, row) for k, row in enumerate(rows) if row.condition == condition):
                w = _within(low_nm, row.wavelength_from_nm, row.wavelength_to_nm, LAST_NM)
                t = _within(low_s, row.time_from_s, row.time_to_s, LAST_S)
                number[np.ix_(w, t)] = k
        # The last element stands for "no row".
        self._measured_m = np.array([1e-3 * r.coefficient_mm for r in rows] + [0.0])
        self._measured_power = np.array([r.time_power for r in rows] + [0.0])
        self._measured_at_m = np.array([r.distance_m for r in rows] + [0.0])
        slots = max(table.shape[1] for table in self.grid.table.values())
        tables = [self.grid.table[target] for target in self.targets]
        self._rows = np.stack(
            [np.pad(t, ((0, 0), (0, slots - t.shape[1])), constant_values=-1) for t in tables]
        )


@lru_cache(maxsize=4)
def compiled_schemes(data: Path) -> dict[str, CompiledScheme]:
    """Every scheme under ``data/classes``, the default first. Raises TableError."""
    sources = read_sources(data / "sources.toml")
    folders = sorted(p.parent for p in (data / "classes").glob("*/scheme.toml"))
    folders.sort(key=lambda p: p.name != DEFAULT_SCHEME)
    additivity = data / "rules" / "additivity.csv"
    return {p.name: CompiledScheme(load_scheme(p, additivity, sources)) for p in folders}
