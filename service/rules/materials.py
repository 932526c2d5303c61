"""Refractive indices and reflectances of common materials, as a table."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

from service.rules.tables import Row, TableError, read_rows, read_sources

__all__ = ["MaterialRow", "material_row", "materials"]


@dataclass(frozen=True, slots=True)
class MaterialRow(Row):
    """One material at one wavelength [nm]: its refractive index, or its reflectance at normal incidence."""

    material: str
    wavelength_nm: float
    refractive_index: float | None
    reflectance: float | None


@lru_cache(maxsize=4)
def materials(data: Path) -> dict[str, list[MaterialRow]]:
    """Rows by material, under ``data/materials.csv``. Raises TableError."""
    path = data / "materials.csv"
    found: dict[str, list[MaterialRow]] = {}
    for row in read_rows(path, MaterialRow, read_sources(data / "sources.toml")):
        if (row.refractive_index is None) == (row.reflectance is None):
            raise TableError(path, row.line, "give refractive_index or reflectance, one of the two")
        found.setdefault(row.material, []).append(row)
    return found


def material_row(rows: list[MaterialRow], wavelength_nm: float) -> MaterialRow:
    """The row whose wavelength lies nearest, counted in powers of ten."""
    return min(rows, key=lambda r: abs(math.log(r.wavelength_nm / wavelength_nm)))
