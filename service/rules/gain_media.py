"""Gain media: one row per published figure of a medium."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

from service.rules.tables import Row, Source, TableError, digest_of, read_rows, read_sources

__all__ = ["QUANTITIES", "GainMedia", "GainMedium", "MediumRow", "gain_media"]

#: Quantities of a medium: unit, least and most value that can be meant.
QUANTITIES = {
    "levels": ("1", 3.0, 4.0),
    "lower_ratio": ("1", 0.0, 1.0),
    "wavelength_nm": ("nm", 180.0, 1e6),
    "pump_wavelength_nm": ("nm", 10.0, 1e6),
    "lifetime_s": ("s", 1e-12, 1.0),
    "cross_section_cm2": ("cm2", 1e-24, 1e-10),
    "density_cm3": ("1/cm3", 1e6, 1e23),
    "quantum_yield": ("1", 0.01, 2.0),
    "refractive_index": ("1", 1.0, 4.0),
}
#: A medium may lack these.
OPTIONAL = {"density_cm3"}
HOSTS = ("crystal", "glass", "fibre", "liquid", "gas")


@dataclass(frozen=True, slots=True)
class MediumRow(Row):
    """One figure of a medium."""

    medium: str
    name: str
    host: str
    figure: str
    value: float
    unit: str


@dataclass(frozen=True, slots=True)
class GainMedium:
    """One medium: its rows by figure."""

    key: str
    name: str
    host: str
    rows: dict[str, MediumRow]

    def value(self, quantity: str) -> float | None:
        """A figure in the unit of its name, None where the table has none."""
        row = self.rows.get(quantity)
        return None if row is None else row.value


@dataclass(frozen=True, slots=True)
class GainMedia:
    """All media by key, in file order, with their documents and the digest of the table."""

    media: dict[str, GainMedium]
    sources: dict[str, Source]
    digest: str

    def source_text(self, row: MediumRow) -> str:
        """Document and place of a row, with its note."""
        text = f"{self.sources[row.source].short}, {row.locator}"
        return f"{text}; {row.note}" if row.note else text


@lru_cache(maxsize=4)
def gain_media(data: Path) -> GainMedia:
    """The table ``gain_media.csv`` under a data folder. Raises TableError naming file and line."""
    path = data / "gain_media.csv"
    sources = read_sources(data / "sources.toml")
    media: dict[str, GainMedium] = {}
    for row in read_rows(path, MediumRow, sources):
        medium = media.setdefault(row.medium, GainMedium(row.medium, row.name, row.host, {}))
        if (row.name, row.host) != (medium.name, medium.host) or row.host not in HOSTS:
            raise TableError(path, row.line, f"{row.medium}: another name or host, or an unknown host")
        if row.figure not in QUANTITIES or row.figure in medium.rows:
            raise TableError(path, row.line, f"quantity {row.figure!r} is unknown or stands twice")
        unit, low, high = QUANTITIES[row.figure]
        if row.unit != unit or not low <= row.value <= high:
            raise TableError(path, row.line, f"{row.figure} is not in {low:g} to {high:g} {unit}")
        medium.rows[row.figure] = row
    for medium in media.values():
        line = min(row.line for row in medium.rows.values())
        missing = QUANTITIES.keys() - OPTIONAL - medium.rows.keys()
        if missing:
            raise TableError(path, line, f"{medium.key}: missing {', '.join(sorted(missing))}")
        ratio, levels = medium.rows["lower_ratio"].value, medium.rows["levels"].value
        if (levels == 4.0) != (ratio == 0.0):
            raise TableError(path, line, f"{medium.key}: lower_ratio {ratio:g} with {levels:g} levels")
    return GainMedia(media, sources, digest_of([path]))
