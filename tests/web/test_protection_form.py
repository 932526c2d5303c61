"""Pairs and windows on the form: typed, picked, added, removed, and kept in the address."""

from __future__ import annotations

import json
from typing import Any
from urllib.parse import parse_qsl, urlsplit

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.web.shelf import BadRanges, parse_ranges
from tests.web.client import Client
from tests.web.pages import CW, HTML, address, page
from tests.web.protection_forms import FORMS, SHELF, Filled
from tests.web.shape import assert_problem
from tests.web.test_addresses import ELEMENTS, ONE, target

PAIR = {"pairs": "1", "pair_ranges-1": "532: OD 5"}
WINDOW = {"windows": "1", "window_distance_m-1": "1"}
PAIR_FIELDS = ("pair_name", "pair_ranges", "pair_light_percent")
WINDOW_FIELDS = ("window_name", "window_distance_m", "window_density")


def values(url: str) -> dict[str, str]:
    return dict(parse_qsl(urlsplit(url).query))


@pytest.mark.parametrize("filled", FORMS.values(), ids=FORMS.keys())
def test_an_address_is_the_request_it_stands_for(client: Client, filled: Filled) -> None:
    root = page(client, address(filled.fields))
    shown: dict[str, Any] = json.loads(root.one("pre").text)
    assert shown == {k: v for k, v in client.evaluate(filled.request())["inputs"].items() if v is not None}
    again = client.evaluate(shown)
    assert again["protection"] == client.evaluate(filled.request())["protection"]


@pytest.mark.parametrize("filled", FORMS.values(), ids=FORMS.keys())
def test_redirects_end_after_one_step_and_keep_every_value(client: Client, filled: Filled) -> None:
    one = target(client, address(filled.fields))
    assert target(client, one) == one
    kept = values(one)
    for name, value in filled.fields.items():
        if kept[name] != value:
            assert float(kept[name].replace(",", ".")) == float(value.replace(",", "."))
    assert set(kept) == {"v", *filled.fields}


@pytest.mark.parametrize("filled", FORMS.values(), ids=FORMS.keys())
def test_the_form_holds_what_was_typed(client: Client, filled: Filled) -> None:
    url = target(client, address(filled.fields))
    root = page(client, url)
    for name, value in values(url).items():
        if name.startswith(("pair_", "window_")):
            assert root.by_id(name).attributes["value"] == value
        elif name in ("pairs", "windows"):
            assert root.one("input", type="hidden", name=name).attributes["value"] == value
    for key in SHELF:
        box = root.one("input", type="checkbox", name=f"shelf-{key}")
        assert ("checked" in box.attributes) == (f"shelf-{key}" in filled.fields)


WAYS = {
    "another order": "&shelf-near-infrared=1&window_distance_m-1=3&pair_ranges-1=532%3A%20OD%205&windows=1"
    "&pairs=1",
    "blank fields": "&pairs=1&pair_ranges-1=532:+OD+5&pair_name-1=&pair_light_percent-1=+&windows=1"
    "&window_name-1=&window_distance_m-1=3&window_density-1=&shelf-near-infrared=1",
    "other numbers": "&pairs=1&pair_ranges-1=532:+OD+5&windows=1&window_distance_m-1=3,0"
    "&shelf-near-infrared=1",
}
CANONICAL = (
    ONE + "&pairs=1&pair_ranges-1=532%3A%20OD%205&windows=1&window_distance_m-1=3&shelf-near-infrared=1"
)


@pytest.mark.parametrize("more", WAYS.values(), ids=WAYS.keys())
def test_every_way_leads_to_the_one_address(client: Client, more: str) -> None:
    assert target(client, ONE + more) == CANONICAL
    assert target(client, CANONICAL) == CANONICAL


def test_no_pairs_and_no_windows_leave_no_trace(client: Client) -> None:
    assert target(client, ONE + "&pairs=0&windows=0&shelf-near-infrared=") == ONE


def test_the_blank_form_offers_the_shelf_and_buttons(client: Client) -> None:
    root = page(client, "/")
    for key, pair in SHELF.items():
        box = root.one("input", type="checkbox", name=f"shelf-{key}")
        assert box.attributes["value"] == "1"
        assert "checked" not in box.attributes
        (label,) = (e for e in root.all("label") if pair["name"] in e.text)
        assert "invented" in label.text
        assert label.all("input") == [box]
    boxes = [b.attributes["name"] for b in root.all("input", type="checkbox")]
    assert boxes == ["outdoors", *(f"shelf-{key}" for key in SHELF)]
    assert [b.attributes["value"] for b in root.all("button", name="change")] == [
        "copy-line-1", "add-line", *(f"add-element-{e}" for e in ELEMENTS), "add-pair", "add-window",
    ]  # fmt: skip
    assert not [i for i in root.ids if i.startswith(("pair_", "window_"))]


@pytest.mark.parametrize(
    ("part", "word", "fields"), [("pairs", "pair", PAIR_FIELDS), ("windows", "window", WINDOW_FIELDS)]
)
def test_parts_are_added_and_removed(client: Client, part: str, word: str, fields: tuple[str, ...]) -> None:
    def changes(root: Any) -> list[str]:
        return [b.attributes["value"] for b in root.all("button", name="change")]

    added = page(client, ONE + f"&change=add-{word}")
    assert "verdict-title" not in added.ids
    assert added.by_id("power_w-1").attributes["value"] == "0.1"
    for name in fields:
        field = added.by_id(f"{name}-1")
        assert field.attributes["value"] == ""
        assert added.all("label", for_=f"{name}-1")
    assert f"remove-{word}-1" in changes(added)
    url = target(client, ONE + f"&change=add-{word}")
    assert values(url)[part] == "1"
    two = target(client, url.partition("#")[0] + f"&{fields[0]}-1=first&change=add-{word}")
    two = two.partition("#")[0]
    assert (values(two)[part], values(two)[f"{fields[0]}-1"]) == ("2", "first")
    filled = two + f"&{fields[0]}-2=second"
    less = target(client, filled + f"&change=remove-{word}-2").partition("#")[0]
    assert values(less)[part] == "1"
    assert f"{fields[0]}-2" not in values(less)
    assert values(less)[f"{fields[0]}-1"] == "first"
    other = values(target(client, filled + f"&change=remove-{word}-1"))
    assert (other[part], other[f"{fields[0]}-1"]) == ("1", "second")
    none = target(client, less + f"&change=remove-{word}-1")
    assert part not in values(none)
    assert not [n for n in values(none) if n.startswith(f"{word}_")]
    assert f"remove-{word}-1" not in changes(page(client, none))


@pytest.mark.parametrize(("part", "word"), [("pairs", "pair"), ("windows", "window")])
def test_parts_stay_between_none_and_twenty(client: Client, part: str, word: str) -> None:
    assert_problem(client.get(ONE + f"&change=remove-{word}-1"), 400, "change")
    most = values(target(client, ONE + f"&{part}=20&change=add-{word}"))
    assert most[part] == "20"


def test_changing_one_part_keeps_the_others(client: Client) -> None:
    fields = {**CW, **PAIR, **WINDOW, "shelf-far-infrared": "1"}
    for change in ("add-line", "add-pair", "add-window"):
        kept = values(target(client, address(fields, change=change)))
        for name, value in fields.items():
            if name not in ("lines", "pairs", "windows"):
                assert kept[name] == value, (change, name)


BAD = {
    "pair that is not there": ("&pair_name-1=x", "pair_name-1"),
    "second pair of one": ("&pairs=1&pair_name-2=x", "pair_name-2"),
    "pair zero": ("&pairs=1&pair_name-0=x", "pair_name-0"),
    "window that is not there": ("&windows=1&window_density-2=1", "window_density-2"),
    "too many pairs": ("&pairs=21", "pairs"),
    "negative pairs": ("&pairs=-1", "pairs"),
    "pairs in words": ("&pairs=one", "pairs"),
    "pairs in other digits": ("&pairs=%EF%BC%91", "pairs"),
    "too many windows": ("&windows=21", "windows"),
    "windows twice": ("&windows=1&windows=1", "windows"),
    "unknown shelf pair": ("&shelf-magic=1", "shelf-magic"),
    "shelf pair with another value": ("&shelf-near-infrared=yes", "shelf-near-infrared"),
    "shelf pair twice": ("&shelf-near-infrared=1&shelf-near-infrared=1", "shelf-near-infrared"),
    "unknown change": ("&change=add-goggles", "change"),
    "a name of the API": ("&eyewear=1", "eyewear"),
}


@pytest.mark.parametrize(("more", "name"), BAD.values(), ids=BAD.keys())
def test_bad_addresses_are_refused_by_name(client: Client, more: str, name: str) -> None:
    root = page(client, ONE + more, 400)
    assert name in root.one("main").one("strong").text
    assert_problem(client.get(ONE + more), 400, name)


#: Mistakes in the form: fields, the field that is named, words that help.
MISTAKES = {
    "no ranges": ({"pairs": "1"}, "pair_ranges-1", ["780-1100: OD 7 | D LB6 + IR LB7"]),
    "only a name": ({"pairs": "1", "pair_name-1": "x"}, "pair_ranges-1", ["no range"]),
    "no colon": ({"pairs": "1", "pair_ranges-1": "532 OD 5"}, "pair_ranges-1", ["532 OD 5"]),
    "no wavelength": ({"pairs": "1", "pair_ranges-1": ": OD 5"}, "pair_ranges-1", ["no range"]),
    "nothing offered": ({"pairs": "1", "pair_ranges-1": "532:"}, "pair_ranges-1", ["neither"]),
    "two densities": ({"pairs": "1", "pair_ranges-1": "532: OD 5 | OD 6"}, "pair_ranges-1", ["two values"]),
    "two marks": ({"pairs": "1", "pair_ranges-1": "532: D LB5 | IR LB6"}, "pair_ranges-1", ["two values"]),
    "density in words": ({"pairs": "1", "pair_ranges-1": "532: OD five"}, "pair_ranges-1", ["number"]),
    "ambiguous number": ({"pairs": "1", "pair_ranges-1": "1,064: OD 5"}, "pair_ranges-1", ["1.064", "1064"]),
    "wavelength in words": ({"pairs": "1", "pair_ranges-1": "green: OD 5"}, "pair_ranges-1", ["number"]),
    "range reversed": ({"pairs": "1", "pair_ranges-1": "1100-780: OD 5"}, "pair_ranges-1", ["below"]),
    "micrometres": ({"pairs": "1", "pair_ranges-1": "1.064: OD 5"}, "pair_ranges-1", ["180"]),
    "density too large": ({"pairs": "1", "pair_ranges-1": "532: OD 21"}, "pair_ranges-1", ["20"]),
    "older mark": ({"pairs": "1", "pair_ranges-1": "532: D L5"}, "pair_ranges-1", ["LB1 to LB10"]),
    "unknown mark": ({"pairs": "1", "pair_ranges-1": "532: CE"}, "pair_ranges-1", ["LB1 to LB10"]),
    "number too large": ({"pairs": "1", "pair_ranges-1": "532: D LB11"}, "pair_ranges-1", ["LB1 to LB10"]),
    "second range wrong": (
        {"pairs": "1", "pair_ranges-1": "532: OD 5; 1064: OD x"}, "pair_ranges-1", ["number"],
    ),
    "second pair wrong": (
        {"pairs": "2", "pair_ranges-1": "532: OD 5", "pair_ranges-2": "x"}, "pair_ranges-2", ["no range"],
    ),
    "name too long": ({**PAIR, "pair_name-1": "x" * 201}, "pair_name-1", ["200"]),
    "light above all": ({**PAIR, "pair_light_percent-1": "101"}, "pair_light_percent-1", ["100"]),
    "no light": ({**PAIR, "pair_light_percent-1": "0"}, "pair_light_percent-1", ["0"]),
    "light in words": ({**PAIR, "pair_light_percent-1": "62 %"}, "pair_light_percent-1", ["number"]),
    "no distance": ({"windows": "1"}, "window_distance_m-1", ["needed"]),
    "distance behind": ({**WINDOW, "window_distance_m-1": "-1"}, "window_distance_m-1", ["0"]),
    "distance in words": ({**WINDOW, "window_distance_m-1": "far"}, "window_distance_m-1", ["number"]),
    "window too dense": ({**WINDOW, "window_density-1": "20.1"}, "window_density-1", ["20"]),
    "density of a window negative": ({**WINDOW, "window_density-1": "-1"}, "window_density-1", ["0"]),
    "name of a window too long": ({**WINDOW, "window_name-1": "x" * 201}, "window_name-1", ["200"]),
    "window two of two": (
        {"windows": "2", "window_distance_m-1": "1", "window_distance_m-2": "x"},
        "window_distance_m-2",
        ["number"],
    ),
}  # fmt: skip


@pytest.mark.parametrize(("more", "name", "told"), MISTAKES.values(), ids=MISTAKES.keys())
def test_mistakes_are_told_at_their_field(
    client: Client, more: dict[str, str], name: str, told: list[str]
) -> None:
    """The summary links to the field, the field says what is wrong, nothing is computed."""
    root = page(client, address({**CW, **more}), 422)
    assert root.one("head").one("title").text.startswith("Error: ")
    assert "verdict-title" not in root.ids
    links = [a.attributes["href"] for a in root.one("section", role="alert").all("a")]
    assert links == [f"#{name}"]
    field = root.by_id(name)
    assert field.attributes["aria-invalid"] == "true"
    assert f"{name}-error" in field.attributes["aria-describedby"].split()
    assert field.attributes["value"] == more.get(name, "")
    words = root.by_id(f"{name}-error").text + root.one("section", role="alert").text
    for part in told:
        assert part in words


def test_the_allowed_share_of_light_is_told_in_percent(client: Client) -> None:
    """The field is in percent; 'above 0 to 1' would send the reader the wrong way."""
    root = page(client, address({**CW, **PAIR, "pair_light_percent-1": "150"}), 422)
    words = root.one("section", role="alert").text
    assert "100" in words
    assert "0 to 1)" not in words


def test_a_right_pair_beside_a_wrong_one_keeps_its_value(client: Client) -> None:
    fields = {
        **CW,
        "pairs": "2",
        "pair_ranges-1": "532: OD 5",
        "pair_ranges-2": "x",
        "shelf-far-infrared": "1",
    }
    root = page(client, address(fields), 422)
    assert root.by_id("pair_ranges-1").attributes["value"] == "532: OD 5"
    assert "aria-invalid" not in root.by_id("pair_ranges-1").attributes
    assert "checked" in root.one("input", name="shelf-far-infrared").attributes


def test_more_pairs_than_are_judged_are_told_at_a_field(client: Client) -> None:
    """Twenty typed and one from the shelf: the link in the summary must lead somewhere."""
    fields = {**CW, "pairs": "20", **{f"pair_ranges-{k}": "532: OD 5" for k in range(1, 21)}}
    root = page(client, address({**fields, "shelf-far-infrared": "1"}), 422)
    links = root.one("section", role="alert").all("a")
    assert links
    for link in links:
        assert link.attributes["href"].removeprefix("#") in root.ids


def test_a_full_form_is_read(client: Client) -> None:
    """16 lines, 20 pairs, 20 windows, every field sent as a browser sends it: not too many parameters."""
    one_line = {k.removesuffix("-1"): v for k, v in CW.items() if k.endswith("-1")}
    page_of_all = page(client, "/evaluate?v=1&lines=16&pairs=20&windows=20&edit=1")
    names = {e.attributes["name"] for e in page_of_all.one("form").walk() if e.tag in ("input", "select")}
    items = dict.fromkeys(names, "") | {"v": "1", "lines": "16", "pairs": "20", "windows": "20"}
    for k in range(1, 17):
        items |= {f"{n}-{k}": v for n, v in one_line.items()}
    for k in range(1, 21):
        items |= {f"pair_ranges-{k}": "532: OD 5", f"window_distance_m-{k}": "1"}
    items["rules"] = "icnirp-2013"
    response = client.get(address(items), headers=HTML)
    assert response.status_code == 303
    root = page(client, response.headers["location"])
    assert len(root.all("div", class_="pair")) == 20
    assert len(root.by_id("windows").one("tbody").all("tr")) == 20


RANGES = {
    "532: OD 5": [{"from_nm": 532, "to_nm": 532, "optical_density": 5}],
    "532:OD5": [{"from_nm": 532, "to_nm": 532, "optical_density": 5}],
    "780-1100: OD 7 | D LB6 + IR LB7": [
        {"from_nm": 780, "to_nm": 1100, "optical_density": 7, "marking": "D LB6 + IR LB7"}
    ],
    "780 \u2013 1100 : D LB6|od 7,5": [
        {"from_nm": 780, "to_nm": 1100, "optical_density": 7.5, "marking": "D LB6"}
    ],
    "532: RB2; 1064: OD 7;": [
        {"from_nm": 532, "to_nm": 532, "marking": "RB2"},
        {"from_nm": 1064, "to_nm": 1064, "optical_density": 7},
    ],
    "632,8-632,9: OD 4": [{"from_nm": 632.8, "to_nm": 632.9, "optical_density": 4}],
    "190-540: 180-315 D LB6 + >315-540 D LB5": [
        {"from_nm": 190, "to_nm": 540, "marking": "180-315 D LB6 + >315-540 D LB5"}
    ],
}


@pytest.mark.parametrize(("text", "ranges"), RANGES.items())
def test_typed_ranges(text: str, ranges: list[dict[str, Any]]) -> None:
    assert parse_ranges(text) == ranges


@given(st.text(alphabet="0123456789 .,-\u2013:;|ODLBIRMXe+>", max_size=60))
def test_any_text_is_read_or_refused_with_a_reason(text: str) -> None:
    reason, found = "", []
    try:
        found = parse_ranges(text)
    except BadRanges as error:
        reason = str(error)
    assert bool(found) != bool(reason.strip())
    for entry in found:
        assert {"from_nm", "to_nm"} < set(entry) <= {"from_nm", "to_nm", "optical_density", "marking"}
