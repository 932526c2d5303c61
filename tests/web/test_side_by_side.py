"""The same laser under every rule set, with reasons, and the sources of an answer."""

from __future__ import annotations

import re
from decimal import Decimal

import pytest

from tests.web.client import COMPARE, RULES, Client
from tests.web.markup import shown_value
from tests.web.pages import CW, address, as_request, page
from tests.web.test_pages import PULSE, TRAIN, TWO

#: How the values of a source are known, after its name.
TAGS = re.compile("( (read|from memory|computed|entered))+")
FORMS = {"continuous": CW, "train": TRAIN, "pulse": PULSE, "two lines": TWO}


@pytest.mark.parametrize("fields", FORMS.values(), ids=FORMS.keys())
def test_figures_are_those_of_the_comparison(client: Client, fields: dict[str, str]) -> None:
    root = page(client, address(fields))
    results = client.post(COMPARE, json=as_request(fields)).json()["results"]
    by_id = {r["rules"]["id"]: r for r in results}
    rows = root.by_id("side-by-side").one("tbody").all("tr")
    shown = [row.one("a").attributes["href"].rpartition("/")[2] for row in rows]
    assert sorted(shown) == sorted(RULES)
    assert shown[0] == fields.get("rules", RULES[0])
    for rules, row in zip(shown, rows, strict=True):
        answer = by_id[rules]
        found = [float(d.attributes["value"]) for d in row.all("data")]
        wanted = [
            answer["eye"]["hazard_distance_m"] or None, answer["eye"]["hazard_ratio"],
            answer["eye"]["optical_density"], answer["skin"]["hazard_distance_m"] or None,
            answer["skin"]["hazard_ratio"],
        ]  # fmt: skip
        assert found == [w for w in wanted if w is not None]
        for data in row.all("data"):
            assert shown_value(data.text) >= Decimal(data.attributes["value"])


def test_the_strictest_is_marked_and_differences_are_told(client: Client) -> None:
    """905 nm train: 2006/25/EC applies N^-0.25 to every thermal limit, the 2013 family does not."""
    root = page(client, address({**TRAIN, "rules": "icnirp-2013"}))
    results = client.post(COMPARE, json=as_request({**TRAIN, "rules": "icnirp-2013"})).json()["results"]
    worst = max(results, key=lambda r: r["eye"]["hazard_ratio"])["rules"]["id"]
    (marked,) = (r for r in root.by_id("side-by-side").all("tr") if "strictest for the eye" in r.text)
    assert marked.one("a").attributes["href"] == f"/rules/{worst}"
    (differences,) = root.all("dl", class_="differences")
    assert [dt.text for dt in differences.all("dt")] == [
        r["rules"]["title"] for r in results if r["rules"]["id"] != "icnirp-2013"
    ]
    told = [dd.text for dd in differences.all("dd")]
    assert any(t.startswith("Eye: ") and "because" in t and "instead of" in t for t in told)


def test_alike_is_called_alike(client: Client) -> None:
    """532 nm, 0.25 s: ICNIRP 2013 and IEC 60825-1 print the same limit, 18 t^0.75 (from memory)."""
    root = page(client, address(CW))
    (differences,) = root.all("dl", class_="differences")
    parts = [e for e in differences.walk() if e.tag in ("dt", "dd")]
    at = next(k for k, e in enumerate(parts) if e.text.startswith("IEC 60825-1"))
    assert parts[at + 1].text == "Eye: the same figures."


@pytest.mark.parametrize("fields", FORMS.values(), ids=FORMS.keys())
def test_every_source_of_the_answer_is_listed(client: Client, fields: dict[str, str]) -> None:
    root = page(client, address(fields))
    answer = client.evaluate(as_request(fields))
    steps = [
        *answer["working"],
        *answer["eye"]["criteria"],
        *answer["skin"]["criteria"],
        *answer["durations"],
    ]
    for scheme in answer["classification"]:
        steps += scheme["working"]
    (listed,) = root.all("ul", class_="sources")
    texts = [li.text for li in listed.all("li")]
    wanted = {" ".join(s["source"].split()) for s in steps if s["source"]}
    for source in wanted:
        assert [t for t in texts if t.startswith(source) and TAGS.fullmatch(t.removeprefix(source))], source


def test_the_answer_stands_in_the_order_people_read_it(client: Client) -> None:
    """Sentences, cautions, class, distances, eyewear, criteria, working, side by side, sources."""
    root = page(client, address({**CW, "subtense_mrad-1": "5"}))
    order = ["verdict", "cautions", "notices", "class", "figures", "protection"]
    order += ["criteria", "working", "side", "sources"]
    places = [root.ids.index(f"{i}-title") for i in order]
    assert places == sorted(places)


def test_each_figure_comes_with_its_reason(client: Client) -> None:
    """The contract's example: 18 t^0.75 at 0.25 s is 6.36 J/m2 (ICNIRP 2013, from memory), 7 mm aperture."""
    (reasons,) = page(client, address(CW)).all("ul", class_="reasons")
    eye, skin = (li.text for li in reasons.all("li"))
    assert eye.startswith(
        "Eye. Whole exposure governs (retina, thermal): 103 times the limit of 6.36 J/m² over"
    )
    assert "averaged over 7 mm" in eye
    assert skin.startswith("Skin. Whole exposure governs (skin, thermal)")
