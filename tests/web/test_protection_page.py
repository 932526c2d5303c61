"""The page shows class, eyewear, windows and measures as the JSON answer has them."""

from __future__ import annotations

from typing import Any

import pytest

from tests.web.client import Client
from tests.web.markup import Element
from tests.web.pages import CW, address, page
from tests.web.protection_forms import FORMS, THREE, Filled
from tests.web.test_pages import assert_figure, check_page


@pytest.fixture(scope="module", params=FORMS.values(), ids=FORMS.keys())
def both(client: Client, request: pytest.FixtureRequest) -> tuple[Element, dict[str, Any]]:
    """A result page and the answer of the API to the same values."""
    filled: Filled = request.param
    return page(client, address(filled.fields)), client.evaluate(filled.request())


def named(name: str, number: int | None, top: int = 10) -> str:
    """A scale number in words: none, LB6, beyond LB10."""
    if number == 0:
        return "none"
    return f"beyond {name}{top}" if number is None or number > top else f"{name}{number}"


def test_pages_are_well_built(both: tuple[Element, dict[str, Any]]) -> None:
    check_page(both[0])


def test_every_table_is_well_formed(both: tuple[Element, dict[str, Any]]) -> None:
    """Caption, column heads with scope, one row head, as many cells as heads, reachable by keyboard."""
    root, answer = both
    tables = root.all("table")
    # Key figures, chart, criteria twice, working, rule sets side by side, needs of the lines; working of each
    # line; limits and working of each class; windows if there are any.
    protection = answer["protection"]
    windows = bool(protection["windows"])
    assert len(tables) == 7 + len(protection["lines"]) + 2 * len(answer["classification"]) + windows
    captions = [t.one("caption").text for t in tables]
    assert all(captions)
    assert len(set(captions)) >= len(tables) - len(answer["classification"]) + 1
    for table in tables:
        heads = [e for e in table.one("thead").walk() if e.tag in ("th", "td")]
        assert all(h.attributes.get("scope") == "col" for h in heads if h.tag == "th")
        assert all(h.text for h in heads if h.tag == "th")
        for row in table.one("tbody").all("tr"):
            cells = [c for c in row.content if isinstance(c, Element) and c.tag in ("th", "td")]
            assert len(cells) == len(heads)
            assert [c.attributes.get("scope") for c in cells if c.tag == "th"] == ["row"]
    regions = [d for d in root.all("div", class_="scroll") if d.all("table")]
    assert len(regions) == len(tables)
    for region in regions:
        assert region.attributes["role"] == "region"
        assert region.attributes["tabindex"] == "0"
        assert region.attributes["aria-label"].strip()


def test_needs_are_those_of_the_answer(both: tuple[Element, dict[str, Any]]) -> None:
    root, answer = both
    rows = root.by_id("protection-lines").one("tbody").all("tr")
    needs = [
        (found, place)
        for found in answer["protection"]["lines"]
        for place in (found["worst_place"], found["at_distance"])
        if place is not None
    ]
    assert len(rows) == len(needs)
    for row, (found, place) in zip(rows, needs, strict=True):
        assert row.one("th").text.startswith(f"{found['line'] + 1}: ")
        distance, density, transmittance, *behind = row.all("data")
        assert_figure(distance, place["distance_m"], up=False)
        assert_figure(density, place["optical_density"], up=True)
        assert_figure(transmittance, place["transmittance"], up=False)
        for scale in place["scale_numbers"]:
            needed = scale["scale_number_needed"]
            assert f"{scale['mode']} {named('LB', needed)}" in row.text
            if needed != scale["scale_number"]:
                why = "raised, see the working"
                if needed == scale["scale_number_wide_beam"]:
                    why = "wide beam, size factor from memory"
                assert f"(table {named('LB', scale['scale_number'])}; {why})" in row.text
        assert ("LB alone is too weak" in row.text) == place["scale_table_too_weak"]
        if place["scale_table_too_weak"]:
            assert f"need {named('LB', place['scale_number'])}" in row.text
        assert_aligning(row.all("td")[-1].text, behind, place["alignment"])


def assert_aligning(words: str, behind: list[Element], aligning: dict[str, Any] | None) -> None:
    """The number of alignment eyewear; what can remain behind it is told where it is above the limit."""
    if aligning is None or aligning["scale_number"] is None:
        assert words == ("not for this line" if aligning is None else "beyond RB5")
        assert behind == []
        return
    assert words.startswith(f"{named('RB', aligning['scale_number'], 5)} (from memory)")
    assert len(behind) == (aligning["remaining_ratio"] > 1 + 1e-9)
    for data in behind:
        assert_figure(data, aligning["remaining_ratio"], up=True)


def test_working_of_the_needs_is_that_of_the_answer(both: tuple[Element, dict[str, Any]]) -> None:
    root, answer = both
    section = root.one("section", aria_labelledby="protection-title")
    tables = section.all("table", class_="working")
    assert len(tables) == len(answer["protection"]["lines"])
    for table, found in zip(tables, answer["protection"]["lines"], strict=True):
        assert table.one("caption").text.startswith(f"Density and scale numbers of line {found['line'] + 1} ")
        rows, steps = table.one("tbody").all("tr"), found["worst_place"]["working"]
        assert len(rows) == len(steps) > 0
        for row, step in zip(rows, steps, strict=True):
            values = [float(d.attributes["value"]) for d in row.all("data")]
            assert values == ([] if step["value"] is None else [step["value"]])
            if step["source"]:
                assert " ".join(step["source"].split()) in row.text


def test_pairs_are_those_of_the_answer(both: tuple[Element, dict[str, Any]]) -> None:
    """Best first; every verdict, figure, reason and warning of the answer."""
    root, answer = both
    shown = root.all("div", class_="pair")
    pairs = sorted(answer["protection"]["eyewear"], key=lambda p: p["rank"])
    assert len(shown) == len(pairs)
    for block, found in zip(shown, pairs, strict=True):
        head = block.one("h3")
        verdict, colour = "not sufficient", "unsafe"
        if found["sufficient"]:
            verdict, colour = "sufficient", "within"
        elif found["dense_enough"]:
            verdict, colour = "dense enough, but nothing shows that it withstands the beam", "open"
        assert head.text == f"{found['name']}: {verdict}"
        assert head.attributes["class"].split() == ["verdict", colour]
        items = block.all("li")
        lines, together, warnings = (
            items[: len(found["lines"])],
            items[len(found["lines"])],
            items[len(found["lines"]) + 1 :],
        )
        for item, check in zip(lines, found["lines"], strict=True):
            assert_line(item, check, found["alignment_only"])
        if found["alignment_only"]:
            assert together.text.startswith("Not for protection")
            assert together.all("data") == []
        else:
            (total,) = together.all("data")
            assert_figure(total, found["remaining_ratio"], up=True)
        assert ("it would do" in together.text) == (found["sufficient_at_distance"] is True)
        assert ("it would not do" in together.text) == (found["sufficient_at_distance"] is False)
        assert ("luminous transmittance" in together.text) == (found["luminous_transmittance"] is not None)
        assert [w.text for w in warnings] == [f"Note. {' '.join(w.split())}" for w in found["warnings"]]


def assert_line(item: Element, check: dict[str, Any], alignment_only: bool) -> None:
    words = item.one("strong").text
    if check["enough"]:
        expected = "covered strongly enough" if check["covered"] else "needs no filter"
    elif alignment_only and not check["covered"] and check["missing"][0].startswith("alignment"):
        expected = "for aligning only"
    else:
        expected = "too weak" if check["covered"] else "open"
    assert words.startswith(f"{check['wavelength_nm']:g} nm (line {check['line'] + 1})")
    assert words.endswith(f": {expected}.")
    for text in check["missing"]:
        assert text[:1].upper() + text[1:] in item.text
    shown = item.all("data")
    if check["optical_density"] is not None:
        assert_figure(shown.pop(0), check["optical_density_needed"], up=True)
    if alignment_only and not check["covered"]:
        assert shown == []
        assert "not counted" in item.text
    else:
        (remaining,) = shown
        assert_figure(remaining, check["remaining_ratio"], up=True)
    for mode in check["modes"]:
        marked = "not marked" if mode["marked"] is None else named("LB", mode["marked"])
        assert f"Mode {mode['mode']}: {marked}, {named('LB', mode['needed'])} needed" in item.text


def test_windows_are_those_of_the_answer(both: tuple[Element, dict[str, Any]]) -> None:
    root, answer = both
    windows = answer["protection"]["windows"]
    if not windows:
        assert "windows" not in root.ids
        return
    rows = root.by_id("windows").one("tbody").all("tr")
    assert len(rows) == len(windows)
    for row, found in zip(rows, windows, strict=True):
        assert row.one("th").text.startswith(f"{found['name']}, ")
        figures = [
            found["hazard_ratio"],
            found["optical_density_needed"],
            found["remaining_ratio"],
            found["irradiance_w_m2"] or None,
            found["radiant_exposure_j_m2"],
        ]
        told = [f for f in figures if f is not None]
        shown = row.all("data")
        assert len(shown) == len(told)
        for data, value in zip(shown, told, strict=True):
            assert_figure(data, value, up=True)
        _, _, stated, behind, _, screen = row.all("td")
        assert stated.text == (
            "none" if found["optical_density"] is None else f"{found['optical_density']:g}"
        )
        if found["sufficient"] is None:
            assert behind.text == "not stated"
        else:
            assert behind.text.endswith(": sufficient" if found["sufficient"] else ": not sufficient")
        assert screen.text == f"{named('AB', found['screen_number'])}; {found['screen_scope']}"


def test_remarks_and_reminder_are_shown(both: tuple[Element, dict[str, Any]]) -> None:
    root, answer = both
    text = root.one("main").text
    for remark in answer["protection"]["remarks"]:
        assert " ".join(remark.split()) in text
    assert answer["measures"]["reminder"] in text


def test_measures_are_those_of_the_answer(both: tuple[Element, dict[str, Any]]) -> None:
    """In their order, engineering first, each with who asks for it."""
    root, answer = both
    shown = [i.text for group in root.all("ul", class_="checklist") for i in group.all("li")]
    items = answer["measures"]["items"]
    assert shown == [f"{m['text']} ({m['asked_by']})" for m in items]
    orders = list(dict.fromkeys(m["order"] for m in items))
    assert len(root.all("ul", class_="checklist")) == len(orders)
    section = root.one("section", aria_labelledby="measures-title")
    assert section.one("summary").text.startswith(f"{len(items)} points for a Class ")


def test_the_open_line_of_three_is_told_plainly(client: Client) -> None:
    """808, 1064 and 532 nm from one housing, goggles for the first two."""
    root = page(client, address(FORMS["two of three lines"].fields))
    (block,) = root.all("div", class_="pair")
    assert block.one("h3").text == "Near infrared: not sufficient"
    pump, fundamental, green = block.all("li")[:3]
    for item, wavelength in ((pump, "808"), (fundamental, "1064")):
        assert item.one("strong").text.startswith(f"{wavelength} nm")
        assert "open" not in item.text
    assert green.one("strong").text == "532 nm (line 3): open."
    assert "532 nm is not covered" in green.text


def test_a_full_set_of_three_is_told_as_such(client: Client) -> None:
    ranges = "515-540: OD 6 | D LB6; 780-1100: OD 7 | D LB7"
    root = page(client, address({**THREE, "pairs": "1", "pair_ranges-1": ranges}))
    (block,) = root.all("div", class_="pair")
    assert block.one("h3").text == "Pair 1: sufficient"
    assert [i.one("strong").text.partition(": ")[2] for i in block.all("li")[:3]] == [
        "covered strongly enough."
    ] * 3


@pytest.mark.parametrize(
    "percent", ["7", "14", "24", "28", "29", "55", "56", "57", "58", "62", "12.5", "0.1"]
)
def test_luminous_transmittance_is_shown_as_typed(client: Client, percent: str) -> None:
    fields = {**CW, "pairs": "1", "pair_ranges-1": "532: OD 5", "pair_light_percent-1": percent}
    (block,) = page(client, address(fields)).all("div", class_="pair")
    assert f"luminous transmittance {percent} %" in block.text


def test_names_are_text_and_never_markup(client: Client) -> None:
    name = "<img src=x onerror=alert(1)>\"'&"
    fields = {
        **CW,
        "pairs": "1",
        "pair_name-1": name,
        "pair_ranges-1": "532: OD 5",
        "windows": "1",
        "window_name-1": name,
        "window_distance_m-1": "1",
    }
    root = page(client, address(fields))
    assert root.one("main").all("img") == []
    assert root.one("div", class_="pair").one("h3").text.startswith(name)
    assert root.by_id("windows").one("tbody").one("th").text.startswith(name)
    check_page(root)
