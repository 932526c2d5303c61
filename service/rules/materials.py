"""Refractive indices and reflectances of common materials, as a table."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

from service.rules.tables import Row, TableError, read_rows, read_sources

__all__ = ["MaterialRow", "materials", "rows_around"]


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
        rows = found.setdefault(row.material, [])
        if rows and row.wavelength_nm <= rows[-1].wavelength_nm:
            raise TableError(path, row.line, "the wavelengths of a material must ascend")
        rows.append(row)
    return found


def rows_around(rows: list[MaterialRow], wavelength_nm: float) -> tuple[MaterialRow, ...]:
    """The rows on both sides of a wavelength, or the one at it. Raises ValueError outside the rows.

    Between two rows either can be nearer to the truth (gold turns from 75 % to 95 % between green and red),
    so whoever wants a safe reflectance takes the larger of both. Nothing is carried beyond the rows: glass
    that reflects 4 % of visible light reflects a good part of what a CO2 laser sends.
    """
    below = [row for row in rows if row.wavelength_nm <= wavelength_nm]
    above = [row for row in rows if row.wavelength_nm >= wavelength_nm]
    if not below or not above:
        raise ValueError(f"known from {rows[0].wavelength_nm:g} to {rows[-1].wavelength_nm:g} nm only")
    return (below[-1], above[0])
