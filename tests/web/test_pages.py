"""Pages show the figures of the JSON answer, rounded to the safe side, and are built to be read."""

from __future__ import annotations

import json
from decimal import Decimal
from typing import Any

import pytest

from tests.web.client import RULES, SCHEMES, Client
from tests.web.markup import Element, one_unit, shown_value
from tests.web.pages import CW, address, as_request, page

TRAIN = {
    "lines": "1",
    "wavelength_nm-1": "905",
    "mode-1": "train",
    "average_power_w-1": "0.02",
    "pulse_s-1": "1e-7",
    "rate_hz-1": "5000",
    "diameter_mm-1": "1",
    "diameter_y_mm-1": "4",
    "divergence_mrad-1": "12",
    "divergence_y_mrad-1": "3",
    "distance_m": "2",
    "rules": "eu-2006-25",
}
PULSE = {
    "lines": "1",
    "wavelength_nm-1": "1064",
    "mode-1": "pulse",
    "energy_j-1": "0.05",
    "pulse_s-1": "8e-9",
    "diameter_mm-1": "6",
    "divergence_mrad-1": "0.5",
    "profile-1": "tophat",
}
TWO = {
    "lines": "2",
    "wavelength_nm-1": "532",
    "mode-1": "cw",
    "power_w-1": "0.1",
    "diameter_mm-1": "2",
    "divergence_mrad-1": "1",
    "wavelength_nm-2": "1064",
    "mode-2": "cw",
    "power_w-2": "3",
    "diameter_mm-2": "3",
    "divergence_mrad-2": "1.5",
    "level-2": "1/e",
    "subtense_mrad-2": "2",
}
FORMS = {
    "continuous": CW,
    "train at a distance": TRAIN,
    "pulse": PULSE,
    "two lines": TWO,
    "nothing exceeded": {**CW, "power_w-1": "1e-6"},
    "faint": {**CW, "power_w-1": "1e-11"},
    "strong": {**CW, "power_w-1": "90000", "divergence_mrad-1": "0.5", "distance_m": "1000"},
    "waist ahead": {**CW, "waist_m-1": "5", "diameter_mm-1": "0.1", "divergence_mrad-1": "7"},
    "unbounded": {**CW, "divergence_mrad-1": "0"},
}
PAGES = [
    "/",
    "/rules",
    "/classes",
    "/eyewear",
    *(f"/rules/{r}" for r in RULES),
    *(f"/classes/{c}" for c in SCHEMES),
    "/problems/http",
    "/problems/invalid-request",
]


def assert_figure(data: Element, value: float, up: bool) -> None:
    """The machine value is the JSON one; the visible one is not on the unsafe side, nor far off."""
    assert float(data.attributes["value"]) == value
    exact = Decimal(data.attributes["value"])
    if data.text == "none":
        assert exact == 0
        return
    shown = shown_value(data.text)
    excess = shown - exact if up else exact - shown
    assert excess >= 0, f"{data.text} for {value} is on the unsafe side"
    assert excess == 0 or excess < one_unit(exact), f"{data.text} for {value} is rounded too far"


@pytest.fixture(scope="module", params=FORMS.values(), ids=FORMS.keys())
def both(client: Client, request: pytest.FixtureRequest) -> tuple[Element, dict[str, Any]]:
    """A result page and the answer of the API to the same values."""
    return page(client, address(request.param)), client.evaluate(as_request(request.param))


def working_rows(root: Element) -> list[Element]:
    """Rows of the working of the evaluation; the classes have tables of their own beside it."""
    tables = [t for t in root.all("table", class_="working") if t.one("caption").text.startswith("Each step")]
    assert len(tables) == 1
    return tables[0].one("tbody").all("tr")


def figures(root: Element, row: str, column: int) -> list[Element]:
    """Figures of one row of the key figures; column 0 is the eye, 1 the skin."""
    return root.by_id(row).all("td")[column].all("data")


def test_key_figures_are_those_of_the_answer(both: tuple[Element, dict[str, Any]]) -> None:
    root, answer = both
    for column, target in enumerate(("eye", "skin")):
        found = answer[target]
        distance = figures(root, "hazard-distance", column)
        if found["hazard_distance_m"] is None:
            assert distance == []
            assert root.by_id("hazard-distance").all("td")[column].text == "unbounded"
        else:
            assert_figure(distance[0], found["hazard_distance_m"], up=True)
        ends = figures(root, "hazard-zone", column)
        zone = found["hazard_zone_m"] or []
        assert len(ends) == sum(end is not None for end in zone)
        for end, value, up in zip(ends, zone, (False, True), strict=False):
            assert_figure(end, value, up)
        ratio, place = figures(root, "hazard-ratio", column)
        assert_figure(ratio, found["hazard_ratio"], up=True)
        assert_figure(place, found["worst_place_m"], up=False)
        (density,) = figures(root, "optical-density", column)
        assert_figure(density, found["optical_density"], up=True)


def test_figures_at_the_distance(both: tuple[Element, dict[str, Any]]) -> None:
    root, answer = both
    for column, target in enumerate(("eye", "skin")):
        there = answer[target]["at_distance"]
        if there is None:
            assert "at-distance" not in root.ids
            continue
        (ratio,), (density,) = (figures(root, row, column) for row in ("at-distance", "at-distance-density"))
        assert_figure(ratio, there["hazard_ratio"], up=True)
        assert_figure(density, there["optical_density"], up=True)
        words = root.by_id("at-distance").all("td")[column].text
        assert words.endswith("above the limit" if there["exceeded"] else "within the limit")


@pytest.mark.parametrize("target", ["eye", "skin"])
def test_criteria_are_those_of_the_answer(both: tuple[Element, dict[str, Any]], target: str) -> None:
    root, answer = both
    found = answer[target]
    own = found["criteria"][found["governing"]]["hazard_ratio"]
    added = any(s["hazard_ratio"] >= own for s in found["sums"] if len(s["lines"]) > 1)
    rows = root.by_id(f"criteria-{target}").one("tbody").all("tr")
    assert len(rows) == len(found["criteria"]) + len(found["sums"])
    columns = {"limit_j_m2": False, "limit_w_m2": False, "aperture_mm": False, "hazard_ratio": True}
    for number, (row, criterion) in enumerate(zip(rows, found["criteria"], strict=False)):
        shown = row.all("data")
        for data, (name, up) in zip(shown, columns.items(), strict=False):
            assert_figure(data, criterion[name], up)
        if criterion["hazard_distance_m"] is None:
            assert len(shown) == 4
        else:
            assert_figure(shown[4], criterion["hazard_distance_m"], up=True)
        assert ("governs" in row.text) == (number == found["governing"] and not added)
        assert ("largest share" in row.text) == (number == found["governing"] and added)
        assert ("from memory" in row.text) == (criterion["known"] == "memory")
    for row, total in zip(rows[len(found["criteria"]) :], found["sums"], strict=True):
        assert_figure(row.all("data")[0], total["hazard_ratio"], up=True)
        assert ("counts" in row.text) == (added and total["hazard_ratio"] == found["hazard_ratio"])


def test_working_is_that_of_the_answer(both: tuple[Element, dict[str, Any]]) -> None:
    root, answer = both
    rows = working_rows(root)
    assert len(rows) == len(answer["working"])
    for row, step in zip(rows, answer["working"], strict=True):
        values = [float(d.attributes["value"]) for d in row.all("data")]
        assert values == ([] if step["value"] is None else [step["value"]])
        if step["source"]:
            assert " ".join(step["source"].split()) in row.text


def test_distances_of_the_working_are_not_rounded_down(both: tuple[Element, dict[str, Any]]) -> None:
    """The page promises that shown figures are rounded to the safe side: distances up."""
    root, answer = both
    rows = working_rows(root)
    for row, step in zip(rows, answer["working"], strict=True):
        if step["symbol"] == "z" and step["value"]:
            assert Decimal(row.one("data").text.replace(" m", "")) >= Decimal(repr(step["value"]))


def test_nothing_is_left_out(both: tuple[Element, dict[str, Any]]) -> None:
    root, answer = both
    text = root.one("main").text
    for sentence in answer["cautions"]:
        assert " ".join(sentence.split()) in text
    for notice in answer["notices"]:
        assert " ".join(notice["text"].split()) in text
    for duration in answer["durations"]:
        assert duration["basis"] in text
    for digest in ("rules_digest", "request_digest"):
        assert answer["provenance"][digest] in text
    assert answer["rules"]["standing_text"] in text


def test_cautions_come_before_the_figures(both: tuple[Element, dict[str, Any]]) -> None:
    """The verdict first, the cautions with it, every figure below; the form comes after the answer."""
    root, _ = both
    order = [root.ids.index(i) for i in ("verdict-title", "cautions-title", "figures-title", "label")]
    assert order == sorted(order)


def test_the_body_shown_gives_the_same_answer(client: Client, both: tuple[Element, dict[str, Any]]) -> None:
    root, answer = both
    again = client.evaluate(json.loads(root.one("pre").text))
    for part in ("eye", "skin", "provenance"):
        assert again[part] == answer[part]


@pytest.mark.parametrize("url", [*PAGES, *(address(f) for f in FORMS.values() if f["lines"] == "1")])
def test_every_page_is_well_built(client: Client, url: str) -> None:
    root = page(client, url)
    check_page(root)


def test_error_pages_are_well_built(client: Client) -> None:
    for url, status in (
        ("/nowhere", 404),
        ("/rules/none", 404),
        ("/classes/none", 404),
        ("/evaluate?v=0", 400),
        ("/?x=1", 404),
    ):
        check_page(page(client, url, status))
    check_page(page(client, address({**CW, "power_w-1": "much"}), 422))


def check_page(root: Element) -> None:
    """Title, language, one main landmark, one first heading, unique ids, nothing inline, labels."""
    assert root.one("html").attributes["lang"] == "en"
    title = root.one("head").one("title").text
    assert title.endswith("· Blinkline")
    assert len(title) > len("· Blinkline") + 3
    assert len(root.all("main")) == 1
    assert len(root.one("main").all("h1")) == len(root.all("h1")) == 1
    assert len(set(root.ids)) == len(root.ids)
    for element in root.walk():
        assert element.tag != "style"
        assert "style" not in element.attributes
        assert not [name for name in element.attributes if name.startswith("on")]
        if element.tag == "script":
            assert element.attributes.get("src", "").startswith("/static/")
            assert element.text == ""
        for name in ("href", "src", "action"):
            assert not element.attributes.get(name, "").startswith(("javascript:", "data:", "http", "//"))
        if element.attributes.get("href", "").startswith("#"):
            assert element.attributes["href"][1:] in root.ids
        for name in ("aria-describedby", "aria-labelledby", "for"):
            for target in element.attributes.get(name, "").split():
                assert target in root.ids, f"{name}={target} points nowhere"
        if element.tag == "input" and element.attributes.get("type") == "text":
            assert root.all("label", for_=element.attributes["id"])
        if element.tag == "img":
            assert "alt" in element.attributes


def test_label_is_text_and_never_markup(client: Client) -> None:
    label = "<script>alert(1)</script>\"'&"
    root = page(client, address({**CW, "label": label}))
    assert root.one("h1").text == label
    scripts = [s.attributes["src"].partition("?")[0] for s in root.all("script")]
    assert scripts == ["/static/print.js", "/static/chart.js"]


def test_every_starting_example_gives_a_result(client: Client) -> None:
    links = [a.attributes["href"] for a in page(client, "/").all("a")]
    examples = [href for href in links if href.startswith("/evaluate?")]
    assert len(examples) >= 3
    for href in examples:
        response = client.get(href)
        assert response.status_code == 200, "an example must link to its one address"
        assert "verdict-title" in page(client, href).ids


@pytest.mark.parametrize("rules", RULES)
def test_rules_page_shows_every_row_and_how_it_is_known(client: Client, rules: str) -> None:
    document = client.get(f"/api/v1/rules/{rules}").json()
    root = page(client, f"/rules/{rules}")
    for target in ("eye", "skin"):
        rows = root.by_id(f"limits-{target}").one("tbody").all("tr")
        printed = [r for r in document["limits"] if r["target"] == target]
        assert [row.all("code")[0].text for row in rows] == [r["row"] for r in printed]
        assert_known(rows, printed)
    for table in ("apertures", "repetition", "durations", "additivity"):
        assert_known(root.by_id(table).one("tbody").all("tr"), document[table])
    steps = list(document["steps"].values())
    assert_known(root.by_id("factors").one("tbody").all("tr"), document["factors"] + steps)


def assert_known(rows: list[Element], printed: list[dict[str, Any]]) -> None:
    assert len(rows) == len(printed)
    for row, entry in zip(rows, printed, strict=True):
        word = {"memory": "from memory", "read": "read"}[entry["known"]]
        assert row.all("td")[-1].text == word
        assert entry["locator"] in row.text
        assert " ".join(entry["note"].split()) in row.text


def test_list_of_rule_sets_links_to_each(client: Client) -> None:
    links = [a.attributes.get("href") for a in page(client, "/rules").one("main").all("a")]
    classes = [f"/classes/{c}" for c in SCHEMES]
    assert links == [*(f"/rules/{r}" for r in RULES), *classes, "/eyewear"]
    assert [a.attributes.get("href") for a in page(client, "/classes").one("main").all("a")] == classes
