"""The checklist of control measures: its entries, its filter, its order, its reminder."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pytest

from service.contract.measures import measures_for
from tests.web.client import RULES, Client, laser

ENTRIES: list[dict[str, Any]] = tomllib.loads(
    (Path(__file__).parents[2] / "data" / "measures.toml").read_text(encoding="utf-8")
)["measure"]
ORDER = ["engineering", "administrative", "personal", "other"]
#: Class names of IEC 60825-1:2014 (from memory).
CLASSES = ["1", "1C", "1M", "2", "2M", "3R", "3B", "4"]
KEYS = {"id", "order", "text", "classes", "asked_by"}
BANDS = {"wavelength_from_nm", "wavelength_to_nm", "min_irradiance_w_m2"}


def ids(hazard_class: str, *wavelengths: float, irradiance: float = 1e9) -> list[str]:
    return [m.id for m in measures_for(hazard_class, list(wavelengths), irradiance).items]


@pytest.mark.parametrize("entry", ENTRIES, ids=[e["id"] for e in ENTRIES])
def test_every_entry_is_complete(entry: dict[str, Any]) -> None:
    assert KEYS <= set(entry) <= KEYS | BANDS
    assert entry["order"] in ORDER
    assert entry["classes"]
    assert set(entry["classes"]) <= set(CLASSES)
    assert len(set(entry["classes"])) == len(entry["classes"])
    assert entry["text"].endswith(".")
    assert entry["text"][0].isupper()
    assert entry["text"] == " ".join(entry["text"].split())
    assert entry["asked_by"].strip()
    low, high = entry.get("wavelength_from_nm", 0), entry.get("wavelength_to_nm", 1e9)
    assert low < high
    assert ("wavelength_from_nm" in entry) == ("wavelength_to_nm" in entry)
    assert entry.get("min_irradiance_w_m2", 1) > 0


def test_entries_differ() -> None:
    for name in ("id", "text"):
        assert len({e[name] for e in ENTRIES}) == len(ENTRIES)


@pytest.mark.parametrize("hazard_class", CLASSES)
def test_engineering_comes_first(hazard_class: str) -> None:
    for wavelength in (266.0, 532.0, 1064.0, 10600.0):
        found = [m.order for m in measures_for(hazard_class, [wavelength], 1e9).items]
        assert found == sorted(found, key=ORDER.index)
        assert found


def test_every_entry_is_reached() -> None:
    found = {i for c in CLASSES for w in (266.0, 532.0, 1064.0, 10600.0) for i in ids(c, w)}
    assert found == {e["id"] for e in ENTRIES}


@pytest.mark.parametrize("hazard_class", CLASSES)
def test_only_entries_of_the_class(hazard_class: str) -> None:
    everywhere = {e["id"] for e in ENTRIES if hazard_class in e["classes"] and "wavelength_from_nm" not in e}
    banded = {e["id"] for e in ENTRIES if hazard_class in e["classes"]}
    for wavelength in (266.0, 532.0, 1064.0):
        assert everywhere <= set(ids(hazard_class, wavelength)) <= banded


def test_stronger_classes_ask_for_more() -> None:
    """Eyewear, a key and a door interlock from 3B on; an emergency stop for class 4."""
    for name, least in (("eyewear", 6), ("key", 6), ("interlock-door", 6), ("emergency-stop", 7)):
        assert [name in ids(c, 1064.0) for c in CLASSES] == [k >= least for k in range(len(CLASSES))]


WAVELENGTHS = {
    # Ultraviolet up to 400 nm, what the eye cannot see from 700 nm on.
    "find-ultraviolet": [(180, True), (355, True), (399.9, True), (400, False), (1064, False)],
    "skin-ultraviolet": [(266, True), (400, False)],
    "find-infrared": [(532, False), (699.9, False), (700, True), (1064, True), (10600, True)],
    "eyewear-align": [(399.9, False), (400, True), (532, True), (699.9, True), (700, False)],
    "no-staring": [(266, False), (532, True), (1064, False)],
}


@pytest.mark.parametrize("name", WAVELENGTHS)
def test_filtered_by_wavelength(name: str) -> None:
    for wavelength, there in WAVELENGTHS[name]:
        assert (name in ids("3B", wavelength)) == there, wavelength


def test_one_line_in_the_band_is_enough() -> None:
    both = ids("4", 266.0, 1064.0)
    assert "find-ultraviolet" in both
    assert "find-infrared" in both
    assert set(both) == set(ids("4", 266.0)) | set(ids("4", 1064.0))
    assert len(set(both)) == len(both)


@pytest.mark.parametrize(("irradiance", "there"), [(0.0, False), (9999.0, False), (1e4, True), (1e9, True)])
def test_fire_by_irradiance(irradiance: float, there: bool) -> None:
    """1e4 W/m2 is common practice, without a source."""
    assert ("fire" in ids("3B", 1064.0, irradiance=irradiance)) == there


@pytest.mark.parametrize(("width_mm", "there"), [(5, True), (10, False)])
def test_the_irradiance_is_that_of_the_beam(client: Client, width_mm: float, there: bool) -> None:
    """0.4 W at 532 nm, Class 3B: 20 372 W/m2 on a top hat of 5 mm, 5093 W/m2 on one of 10 mm."""
    emission = {"mode": "cw", "power_w": 0.4}
    answer = client.evaluate(laser(532, emission, profile="tophat", diameter_mm=width_mm))
    assert answer["classification"][0]["hazard_class"] == "3B"
    assert ("fire" in [m["id"] for m in answer["measures"]["items"]]) == there


@pytest.mark.parametrize("rules", RULES)
def test_the_answer_has_reminder_and_list(client: Client, rules: str) -> None:
    for power in (1e-6, 1e-3, 0.1, 10):
        answer = client.evaluate(laser(1064, {"mode": "cw", "power_w": power}, rules=rules))
        measures = answer["measures"]
        assert "local laser safety officer" in measures["reminder"]
        assert "not a decision" in measures["reminder"]
        orders = [m["order"] for m in measures["items"]]
        assert orders == sorted(orders, key=ORDER.index)
        by_id = {e["id"]: e for e in ENTRIES}
        for item in measures["items"]:
            assert item == {k: by_id[item["id"]][k] for k in ("id", "order", "text", "asked_by")}
            assert answer["classification"][0]["hazard_class"] in by_id[item["id"]]["classes"]
