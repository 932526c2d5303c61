"""The table of gain media is read strictly and says how each figure is known."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from service.files import DATA
from service.rules.gain_media import gain_media
from service.rules.tables import TableError

#: Printed values from memory, written down again here (Koechner; Svelto): key, figure, value.
PINNED = [
    ("nd-yag", "lifetime_s", 2.3e-4),
    ("nd-yag", "cross_section_cm2", 2.8e-19),
    ("nd-yag", "density_cm3", 1.38e20),
    ("ruby", "density_cm3", 1.58e19),
    ("ruby", "lifetime_s", 3e-3),
    ("ruby", "cross_section_cm2", 2.5e-20),
    ("ruby", "wavelength_nm", 694.3),
    ("ti-sapphire", "lifetime_s", 3.2e-6),
    ("co2", "wavelength_nm", 10600.0),
    ("hene", "wavelength_nm", 632.8),
]


@pytest.mark.parametrize(("key", "figure", "value"), PINNED)
def test_pinned_figures(key: str, figure: str, value: float) -> None:
    assert gain_media(DATA).media[key].value(figure) == value


def test_every_row_names_a_document_and_how_it_is_known() -> None:
    table = gain_media(DATA)
    rows = [row for medium in table.media.values() for row in medium.rows.values()]
    assert len(table.media) == 21
    assert len(rows) == 186
    assert {row.known for row in rows} <= {"read", "memory"}
    assert all(table.source_text(row).count(",") for row in rows)


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ("nd-yag,Nd:YAG", "nd-yag,Other", "another name"),
        ("lifetime_s,0.00023,s", "lifetime_s,0.00023,ms", "lifetime_s is not in"),
        ("lifetime_s,0.00023,s", "lifetime_s,230,s", "lifetime_s is not in"),
        ("lower_ratio,0,", "lower_ratio,1,", "with 4 levels"),
        ("lower_ratio,0,1", "colour,0,1", "unknown"),
        ("koechner-2006", "koechner-1999", "not in sources.toml"),
        ("memory", "guess", "known is"),
    ],
)  # fmt: skip
def test_a_wrong_row_is_refused_by_name(tmp_path: Path, old: str, new: str, words: str) -> None:
    shutil.copy(DATA / "sources.toml", tmp_path)
    text = (DATA / "gain_media.csv").read_text(encoding="utf-8")
    assert old in text
    (tmp_path / "gain_media.csv").write_text(text.replace(old, new, 1), encoding="utf-8")
    with pytest.raises(TableError, match=words):
        gain_media(tmp_path)
