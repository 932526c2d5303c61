"""Scale numbers of eyewear and screens as tables: EN 207 (LB), EN 208 (RB), EN 12254 (AB)."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise
from pathlib import Path

from service.rules.tables import Row, Source, TableError, digest_of, read_rows, read_sources

__all__ = ["AlignmentRow", "EyewearTables", "ModeRow", "ScaleRow", "UseRow", "eyewear_tables"]

#: Rules of use that the engine reads.
USED = {
    "count_window",
    "count_exponent",
    "count_rate_above",
    "count_pulse_below",
    "group_count",
    "size_from",
    "size_to",
    "size_exponent_glass_first",
    "en207_mark_y_rate",
    "en207_test_time",
    "en208_target_power",
    "en208_split",
    "en208_shortest",
    "en208_pulse_window",
    "en208_count_exponent",
    "en208_aperture",
    "en208_target_energy",
    "en12254_mean_power",
    "en12254_pulse_energy",
    "en12254_test_time",
}


@dataclass(frozen=True, slots=True)
class ScaleRow(Row):
    """Largest value for scale number n: coefficient x 10^(n + exponent_offset), E [W/m2] or H [J/m2].

    The bands are printed with the upper end included: from < wavelength <= to.
    """

    mode: str
    wavelength_from_nm: float
    wavelength_to_nm: float
    quantity: str
    coefficient: float
    exponent_offset: float


@dataclass(frozen=True, slots=True)
class ModeRow(Row):
    """A test mode by pulse duration [s]: D, I, R or M.

    `upper_end` says whether the longest duration belongs to the mode: "included" or "excluded".
    """

    mode: str
    name: str
    time_from_s: float
    time_to_s: float
    upper_end: str


@dataclass(frozen=True, slots=True)
class AlignmentRow(Row):
    """One scale number of alignment eyewear: largest power [W] and pulse energy [J]."""

    scale: float
    transmittance_from: float
    transmittance_to: float
    wavelength_from_nm: float
    wavelength_to_nm: float
    max_power_w: float
    max_energy_j: float


@dataclass(frozen=True, slots=True)
class UseRow(Row):
    """A rule of use: a value with its unit, its band and what it means."""

    value: float
    unit: str
    wavelength_from_nm: float | None
    wavelength_to_nm: float | None
    text: str


@dataclass(frozen=True, slots=True)
class EyewearTables:
    """The tables as read; `use` by row name, `digest` is sha256 over the files, in name order."""

    scales: tuple[ScaleRow, ...]
    modes: tuple[ModeRow, ...]
    alignment: tuple[AlignmentRow, ...]
    use: dict[str, UseRow]
    sources: dict[str, Source]
    digest: str

    def source_text(self, row: Row) -> str:
        """Document and place of a row, with its note."""
        text = f"{self.sources[row.source].short}, {row.locator}"
        return f"{text}; {row.note}" if row.note else text

    def scale(self, mode: str, wavelength_nm: float) -> ScaleRow:
        """The row of a mode at a wavelength; 180 nm belongs to the first band."""
        return next(
            r
            for r in self.scales
            if r.mode == mode
            and (
                r.wavelength_from_nm < wavelength_nm <= r.wavelength_to_nm
                or wavelength_nm == 180.0 == r.wavelength_from_nm
            )
        )

    def mode(self, duration_s: float) -> str:
        """Test mode of a pulse of this duration."""
        for row in self.modes:
            if duration_s < row.time_to_s or (duration_s == row.time_to_s and row.upper_end == "included"):
                return row.mode
        return self.modes[-1].mode

    def group_time(self, wavelength_nm: float) -> UseRow | None:
        """The time within which pulses count as one; None where the table gives none."""
        for row in self.use.values():
            low, high = row.wavelength_from_nm, row.wavelength_to_nm
            named = row.row.startswith("group_time_")
            if named and low is not None and high is not None and low <= wavelength_nm < high:
                return row
        return None


@lru_cache(maxsize=4)
def eyewear_tables(data: Path) -> EyewearTables:
    """The tables under ``data/eyewear``. Raises TableError."""
    sources = read_sources(data / "sources.toml")
    folder = data / "eyewear"
    tables = EyewearTables(
        read_rows(folder / "scales_en207.csv", ScaleRow, sources),
        read_rows(folder / "modes.csv", ModeRow, sources),
        read_rows(folder / "scales_en208.csv", AlignmentRow, sources),
        {row.row: row for row in read_rows(folder / "rules.csv", UseRow, sources)},
        sources,
        digest_of(sorted(folder.glob("*.csv"))),
    )
    ends = tables.modes
    if (
        any(a.time_to_s != b.time_from_s for a, b in pairwise(ends))
        or any(r.time_from_s >= r.time_to_s or r.upper_end not in ("included", "excluded") for r in ends)
        or (ends[0].time_from_s, ends[-1].time_to_s) != (1e-13, 3e4)
    ):
        raise TableError(folder / "modes.csv", 1, "the modes, shortest first, do not follow on each other")
    if any(a.max_power_w >= b.max_power_w or a.scale >= b.scale for a, b in pairwise(tables.alignment)):
        raise TableError(folder / "scales_en208.csv", 1, "the scale numbers do not ascend")
    missing = USED - set(tables.use)
    if missing:
        raise TableError(folder / "rules.csv", 1, f"rules missing: {sorted(missing)}")
    for mode in tables.modes:
        bands = [(r.wavelength_from_nm, r.wavelength_to_nm) for r in tables.scales if r.mode == mode.mode]
        joined = all(a[1] == b[0] for a, b in pairwise(bands))
        if not bands or bands[0][0] != 180.0 or bands[-1][1] != 1e6 or not joined:
            raise TableError(folder / "scales_en207.csv", 1, f"mode {mode.mode}: the bands leave a gap")
    return tables
