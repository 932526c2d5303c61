"""Every cell of the eyewear tables against numbers typed a second time, and tables that are refused."""

from __future__ import annotations

import csv
import shutil
from collections.abc import Callable
from pathlib import Path

import pytest

from service.rules.eyewear import EyewearTables, eyewear_tables
from service.rules.tables import TableError
from tests.rules.engine import DATA
from tests.rules.printed_eyewear import ALIGNMENT, BANDS, BASIS, CELLS, MODES, USE, WAVELENGTHS

FILES = ("scales_en207", "scales_en208", "modes", "rules", "basis")


@pytest.fixture(scope="module")
def tables() -> EyewearTables:
    return eyewear_tables(DATA)


def rows(name: str) -> list[dict[str, str]]:
    with (DATA / "eyewear" / f"{name}.csv").open(encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


def test_the_printed_table_has_ninety_cells() -> None:
    assert len(CELLS) == 90


@pytest.mark.parametrize("mode", "DIRM")
@pytest.mark.parametrize("band", BANDS)
def test_scale_cell_by_cell(tables: EyewearTables, mode: str, band: str) -> None:
    """coefficient x 10^(n + offset) is the printed cell for n from 1 to 10, and the unit the printed one."""
    (row,) = (r for r in tables.scales if r.mode == mode and r.wavelength_from_nm == BANDS[band][0])
    assert row.wavelength_to_nm == BANDS[band][1]
    assert (row.quantity, row.known) == (BASIS[mode][band][0], "read")
    for number in range(1, 11):
        printed = CELLS["I" if mode == "R" else mode, band, number]
        assert row.coefficient * 10.0 ** (number + row.exponent_offset) == pytest.approx(printed, rel=1e-12)


def test_the_scale_has_no_other_row(tables: EyewearTables) -> None:
    assert len(tables.scales) == 4 * 3


@pytest.mark.parametrize("mode", "DIRM")
@pytest.mark.parametrize("band", WAVELENGTHS)
def test_the_upper_end_belongs_to_a_band(tables: EyewearTables, mode: str, band: str) -> None:
    """Printed 180-315, >315-1400, >1400-1e6: 315 nm and 1400 nm take the lower band."""
    for wavelength in WAVELENGTHS[band]:
        row = tables.scale(mode, wavelength)
        assert (row.mode, row.wavelength_from_nm, row.wavelength_to_nm) == (mode, *BANDS[band])


def test_the_scale_is_the_limits_behind_it_times_ten_a_number() -> None:
    """EN 207 = the simplified limits x 10^n: 0.001, 10, 1000; 30, 0.005, 100; 3e10, 1.5e-4, 1e11."""
    found = {
        (r["mode"], float(r["wavelength_from_nm"])): (r["quantity"], float(r["value"])) for r in rows("basis")
    }
    assert found == {(m, BANDS[b][0]): cell for m, cells in BASIS.items() for b, cell in cells.items()}
    for row in rows("scales_en207"):
        quantity, limit = found[row["mode"], float(row["wavelength_from_nm"])]
        assert row["quantity"] == quantity
        scaled = float(row["coefficient"]) * 10.0 ** float(row["exponent_offset"])
        assert scaled == pytest.approx(limit, rel=1e-12)


@pytest.mark.parametrize(("duration", "mode"), MODES)
def test_mode_by_duration(tables: EyewearTables, duration: float, mode: str) -> None:
    assert tables.mode(duration) == mode


def test_alignment_cell_by_cell(tables: EyewearTables) -> None:
    found = {
        int(r.scale): (r.transmittance_from, r.transmittance_to, r.max_power_w, r.max_energy_j)
        for r in tables.alignment
    }
    assert found == ALIGNMENT
    assert {(r.wavelength_from_nm, r.wavelength_to_nm, r.known) for r in tables.alignment} == {
        (400.0, 700.0, "memory")
    }


def test_every_rule_of_use_is_typed_here(tables: EyewearTables) -> None:
    assert set(tables.use) == set(USE)


@pytest.mark.parametrize("name", USE)
def test_rule_of_use(tables: EyewearTables, name: str) -> None:
    row = tables.use[name]
    band = None if row.wavelength_from_nm is None else (row.wavelength_from_nm, row.wavelength_to_nm)
    assert row.value == pytest.approx(USE[name].value, rel=1e-12)
    assert (row.unit, band, row.known) == USE[name][1:]
    assert row.text.endswith(".")
    if row.known == "memory" and name.startswith(("group_", "size_")):
        assert "low confidence" in row.note


@pytest.mark.parametrize(
    ("wavelength", "seconds"),
    [(399.9, None), (400, 18e-6), (1049.9, 18e-6), (1050, 50e-6), (1399.9, 50e-6), (1400, 1e-3),
     (1500, 10), (1800, 1e-3), (2600, 1e-7), (10600, 1e-7)],
)  # fmt: skip
def test_grouping_time(tables: EyewearTables, wavelength: float, seconds: float | None) -> None:
    """From memory, as the limits of the rule's age group pulses; none below 400 nm."""
    row = tables.group_time(wavelength)
    assert (None if row is None else row.value) == seconds


@pytest.mark.parametrize("name", FILES)
def test_every_row_names_its_source_and_place(tables: EyewearTables, name: str) -> None:
    for row in rows(name):
        assert row["source"] in tables.sources
        assert row["locator"].strip()
        assert row["known"] in ("read", "memory")


def test_source_text_is_document_place_and_note(tables: EyewearTables) -> None:
    row = tables.scale("M", 266)
    text = tables.source_text(row)
    assert text.startswith(tables.sources[row.source].short)
    assert row.locator in text
    assert row.note in text


EDITS: dict[str, tuple[str, Callable[[str], str]]] = {
    "a gap between bands": ("scales_en207", lambda t: t.replace("D,315,1400", "D,316,1400")),
    "an overlap of bands": ("scales_en207", lambda t: t.replace("I,1400,1e6", "I,1390,1e6")),
    "a band that ends early": ("scales_en207", lambda t: t.replace("M,1400,1e6", "M,1400,1e5")),
    "a band that begins late": ("scales_en207", lambda t: t.replace("R,180,", "R,200,")),
    "a mode without a band": (
        "scales_en207",
        lambda t: "".join(line for line in t.splitlines(keepends=True) if not line.startswith("M-")),
    ),
    "a number in words": ("scales_en208", lambda t: t.replace("2e-6", "two")),
    "an unknown source": ("rules", lambda t: t.replace("dguv-203-042", "hearsay", 1)),
    "no source": ("modes", lambda t: t.replace("dguv-203-042", "", 1)),
    "a row twice": ("modes", lambda t: t + t.splitlines()[1] + "\n"),
    "an unknown way of knowing": ("scales_en207", lambda t: t.replace(",read,", ",guessed,", 1)),
    "a column missing": ("scales_en208", lambda t: t.replace("max_energy_j", "energy", 1)),
}


@pytest.mark.parametrize(("name", "edit"), EDITS.values(), ids=EDITS.keys())
def test_wrong_tables_are_refused(tmp_path: Path, name: str, edit: Callable[[str], str]) -> None:
    data = tmp_path / "data"
    shutil.copytree(DATA, data)
    path = data / "eyewear" / f"{name}.csv"
    text = path.read_text(encoding="utf-8")
    assert edit(text) != text
    path.write_text(edit(text), encoding="utf-8")
    with pytest.raises(TableError, match=f"{name}.csv"):
        eyewear_tables(data)
