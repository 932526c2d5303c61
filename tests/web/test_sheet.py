"""The sheet to print, and the tables of eyewear as a page."""

from __future__ import annotations

import csv
from datetime import UTC, datetime
from pathlib import Path

import pytest

from tests.web.client import Client
from tests.web.pages import CW, address, page

EYEWEAR = Path(__file__).resolve().parents[2] / "data" / "eyewear"
TABLES = {
    "scales": "scales_en207",
    "basis": "basis",
    "modes": "modes",
    "alignment": "scales_en208",
    "use": "rules",
}
KNOWN = {"read": "read", "memory": "from memory"}


def test_sheet_has_name_date_and_setup(client: Client) -> None:
    before = datetime.now(UTC).date()
    root = page(client, address({**CW, "windows": "1", "window_name-1": "Door", "window_distance_m-1": "2"}))
    days = {before.isoformat(), datetime.now(UTC).date().isoformat()}
    assert any(f"Evaluated on {day}" in root.text for day in days)
    given = root.by_id("setup-given")
    rows = {name.text: part.text for name, part in zip(given.all("dt"), given.all("dd"), strict=True)}
    assert "Name: Bench 4 alignment beam" in rows["Laser"]
    for part in (
        "Wavelength: 532 nm",
        "Emission: continuous",
        "Power: 0.1 W",
        "Divergence, full angle: 1 mrad",
    ):
        assert part in rows["Emission and beam"]
    assert "Exposure duration: 0.25 s" in rows["Exposure"]
    assert "Viewing distance: not evaluated" in rows["Exposure"]
    assert "Distance of the window: 2 m" in rows["Window 1"]


def test_only_an_answer_has_a_sheet(client: Client) -> None:
    for url, status in (("/", 200), (address({**CW, "power_w-1": "much"}), 422)):
        assert "setup-given" not in page(client, url, status).ids


@pytest.mark.parametrize(("table", "file"), TABLES.items())
def test_eyewear_page_shows_every_row_and_how_it_is_known(client: Client, table: str, file: str) -> None:
    with (EYEWEAR / f"{file}.csv").open(encoding="utf-8", newline="") as handle:
        printed = list(csv.DictReader(handle))
    rows = page(client, "/eyewear").by_id(table).one("tbody").all("tr")
    assert [row.one("code").text for row in rows] == [p["row"] for p in printed]
    for row, entry in zip(rows, printed, strict=True):
        assert row.all("td")[-1].text == KNOWN[entry["known"]]
        assert entry["locator"] in row.text
        assert " ".join(entry["note"].split()) in row.text
