"""The photopic luminous efficiency of the eye and the light levels of protected airspace, as tables."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from service.rules.tables import Row, Source, TableError, read_rows, read_sources

__all__ = ["AirspaceTables", "PhotopicRow", "ZoneRow", "airspace_tables"]

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class PhotopicRow(Row):
    """V at one wavelength [nm], 1 at 555 nm."""

    wavelength_nm: float
    luminous_efficiency: float


@dataclass(frozen=True, slots=True)
class ZoneRow(Row):
    """One zone: the visually corrected irradiance [W/m2] not to be exceeded, and its extent in words."""

    name: str
    level_w_m2: float
    keeps_out: str
    extent: str


@dataclass(frozen=True, slots=True)
class AirspaceTables:
    """V(lambda) in ascending order and the zones, the strictest level first."""

    photopic: tuple[PhotopicRow, ...]
    zones: tuple[ZoneRow, ...]
    sources: dict[str, Source]

    def luminous_efficiency(self, wavelength_nm: Floats) -> Floats:
        """V of each wavelength [nm]: log V is linear between the rows; 0 outside the table."""
        at = np.array([row.wavelength_nm for row in self.photopic])
        log = np.log([row.luminous_efficiency for row in self.photopic])
        inside = (wavelength_nm >= at[0]) & (wavelength_nm <= at[-1])
        return np.where(inside, np.exp(np.interp(wavelength_nm, at, log)), 0.0)


@lru_cache(maxsize=4)
def airspace_tables(data: Path) -> AirspaceTables:
    """The tables under ``data``. Raises TableError."""
    sources = read_sources(data / "sources.toml")
    photopic = read_rows(data / "photopic.csv", PhotopicRow, sources)
    zones = read_rows(data / "airspace.csv", ZoneRow, sources)
    for before, row in pairwise(photopic):
        if row.wavelength_nm <= before.wavelength_nm:
            raise TableError(data / "photopic.csv", row.line, "wavelengths must ascend")
    for row in photopic:
        if not 0.0 < row.luminous_efficiency <= 1.0:
            raise TableError(data / "photopic.csv", row.line, "expected a value above 0, at most 1")
    for lower, zone in pairwise(zones):
        if zone.level_w_m2 <= lower.level_w_m2:
            raise TableError(data / "airspace.csv", zone.line, "levels must ascend")
    return AirspaceTables(tuple(photopic), tuple(zones), sources)
