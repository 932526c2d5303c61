"""The address of an evaluation: one per set of values, and never read in any other way."""

from __future__ import annotations

from urllib.parse import parse_qsl, urlsplit

import pytest

from tests.web.client import Client
from tests.web.pages import CW, HTML, address, as_request, page
from tests.web.shape import assert_problem

#: Elements of the bench that can be added, in the order of the buttons.
ELEMENTS = ("space", "lens", "mirror", "expander", "reflector", "window", "diffuser", "scanner")
ONE = (
    "/evaluate?v=1&label=Bench%204%20alignment%20beam&exposure_s=0.25&lines=1&wavelength_nm-1=532&mode-1=cw"
    "&power_w-1=0.1&diameter_mm-1=2&divergence_mrad-1=1"
)


def target(client: Client, url: str) -> str:
    """Where an address leads; itself if it is answered at once."""
    response = client.get(url, headers=HTML)
    if response.status_code == 303:
        return response.headers["location"]
    assert response.status_code == 200, response.text[:200]
    return url


def test_the_one_address_is_answered_at_once(client: Client) -> None:
    assert target(client, ONE) == ONE


WAYS = {
    "another order": "/evaluate?" + "&".join(sorted(ONE.partition("?")[2].split("&"), reverse=True)),
    "blank fields": ONE + "&waist_m-1=&rules=&distance_m=&subtense_mrad-1=%20",
    "other spellings of numbers": ONE.replace("=0.1&", "=1e-1&").replace("=532", "=532.0"),
    "decimal commas": ONE.replace("=0.1&", "=0,1&").replace("=0.25", "=0,25"),
    "blanks around": ONE.replace("=0.1&", "=%200.1+&"),
    "plus for blank": ONE.replace("%20", "+"),
    "minus and plus signs": ONE.replace("=532", "=%2B532"),
    "no number of lines": ONE.replace("&lines=1", ""),
    "what a browser sends": ONE.replace("v=1", "v=1&lines=1", 1).replace("&exposure_s=0.25&lines=1", "")
    + "&energy_j-1=&pulse_s-1=&average_power_w-1=&rate_hz-1=&diameter_y_mm-1=&exposure_s=0.25",
}


@pytest.mark.parametrize("url", WAYS.values(), ids=WAYS.keys())
def test_every_way_of_typing_leads_to_the_one_address(client: Client, url: str) -> None:
    response = client.get(url, headers=HTML)
    assert response.status_code == 303
    assert response.headers["location"] == ONE


ODD = {
    "umlaut": {"label": "Prüfstand 7 µm"},
    "reserved characters": {"label": "a&b=c+d%20?#/;"},
    "emoji": {"label": "\U0001f600"},
    "zero width and control": {"label": "a\u200bb\x01c"},
    "wrong number": {"power_w-1": "much"},
    "grouped number": {"power_w-1": "1'000"},
    "many digits": {"power_w-1": "0.1000000000000000055511151231257827021181583404541"},
    "tiny": {"power_w-1": "1e-400"},
    "huge": {"power_w-1": "123456789012345678"},
    "sixteen lines": {"lines": "16"},
}


@pytest.mark.parametrize("more", ODD.values(), ids=ODD.keys())
def test_redirects_end_after_one_step(client: Client, more: dict[str, str]) -> None:
    url = address({**CW, **more})
    first = client.get(url, headers=HTML)
    if first.status_code == 303:
        first = client.get(first.headers["location"], headers=HTML)
    assert first.status_code in (200, 422)


def test_an_address_keeps_every_value(client: Client) -> None:
    fields = {**CW, "rules": "eu-2006-25", "waist_m-1": "-0.5", "level-1": "1/e", "subtense_mrad-1": "2"}
    kept = dict(parse_qsl(urlsplit(target(client, address(fields))).query))
    assert kept == {"v": "1", **fields}


def test_no_parameters_lead_to_the_blank_form(client: Client) -> None:
    response = client.get("/evaluate", headers=HTML)
    assert (response.status_code, response.headers["location"]) == (303, "/")


BAD = {
    "unknown parameter": (ONE + "&colour=green", "colour"),
    "parameter of a line that is not there": (ONE + "&power_w-2=1", "power_w-2"),
    "line zero": (ONE + "&power_w-0=1", "power_w-0"),
    "repeated": (ONE + "&power_w-1=0.2", "power_w-1"),
    "repeated alike": (ONE + "&power_w-1=0.1", "power_w-1"),
    "repeated version": (ONE + "&v=1", "v"),
    "an older form": (ONE.replace("v=1", "v=0"), "v"),
    "a newer form": (ONE.replace("v=1", "v=2"), "v"),
    "no version": (ONE.replace("v=1&", ""), "v"),
    "no lines": (ONE.replace("lines=1", "lines=0"), "lines"),
    "too many lines": (ONE.replace("lines=1", "lines=17"), "lines"),
    "lines in words": (ONE.replace("lines=1", "lines=one"), "lines"),
    "lines in other digits": (ONE.replace("lines=1", "lines=%EF%BC%91"), "lines"),
    "unknown mode": (ONE.replace("=cw", "=CW"), "mode-1"),
    "unknown level": (ONE + "&level-1=1/e3", "level-1"),
    "unknown profile": (ONE + "&profile-1=square", "profile-1"),
    "unknown change": (ONE + "&change=double", "change"),
    "unknown edit": (ONE + "&edit=yes", "edit"),
    "a name of another place": (ONE + "&lines.0.power_w=1", "lines.0.power_w"),
}


@pytest.mark.parametrize(("url", "name"), BAD.values(), ids=BAD.keys())
def test_bad_addresses_are_refused_by_name(client: Client, url: str, name: str) -> None:
    root = page(client, url, 400)
    assert name in root.one("main").one("strong").text
    assert "verdict-title" not in root.ids
    assert_problem(client.get(url), 400, name)


def test_too_many_parameters_are_refused(client: Client) -> None:
    response = client.get("/evaluate?v=1" + "&x=1" * 2500)
    assert_problem(response, 400)


def test_the_first_page_takes_no_parameters(client: Client) -> None:
    assert_problem(client.get("/?power_w-1=0.1"), 404)


WRONG = {
    "two readings": ("1,064", ["1.064", "1064"]),
    "grouped with commas": ("1,064,000", ["grouped"]),
    "grouped with points": ("1.064.000", ["grouped"]),
    "grouped with blanks": ("10 600", ["grouped"]),
    "grouped with apostrophes": ("10'600", ["grouped"]),
    "grouped and a fraction": ("1,064.5", ["grouped"]),
    "words": ("green", ["not a number"]),
    "with its unit": ("532 nm", ["not a number"]),
    "not a number": ("NaN", ["not a number"]),
    "infinity": ("inf", ["not a number"]),
    "too large": ("1e999", ["too large"]),
    "micrometres": ("0.532", ["180", "1064"]),
    "negative": ("-532", ["180"]),
}


@pytest.mark.parametrize(("typed", "told"), WRONG.values(), ids=WRONG.keys())
def test_numbers_that_cannot_be_read(client: Client, typed: str, told: list[str]) -> None:
    root = page(client, address({**CW, "wavelength_nm-1": typed}), 422)
    field = root.by_id("wavelength_nm-1")
    assert field.attributes["value"] == typed
    assert field.attributes["aria-invalid"] == "true"
    assert "wavelength_nm-1-error" in field.attributes["aria-describedby"].split()
    words = root.by_id("wavelength_nm-1-error").text + root.one("section", role="alert").text
    for part in told:
        assert part in words
    assert "verdict-title" not in root.ids


def test_a_decimal_comma_is_read(client: Client) -> None:
    root = page(client, address({**CW, "wavelength_nm-1": "1064,5"}))
    assert root.by_id("wavelength_nm-1").attributes["value"] == "1064.5"
    far = root.by_id("hazard-distance").all("data")[0].attributes["value"]
    answer = client.evaluate(as_request({**CW, "wavelength_nm-1": "1064.5"}))
    assert float(far) == answer["eye"]["hazard_distance_m"]


MISTAKES = {
    "nothing entered": {"lines": "1"},
    "two lines, nothing entered": {"lines": "2"},
    "power for a pulse": {**CW, "mode-1": "pulse"},
    "train with neither": {**CW, "mode-1": "train", "power_w-1": "", "pulse_s-1": "1e-8", "rate_hz-1": "1"},
    "train with both": {
        **CW, "mode-1": "train", "power_w-1": "", "pulse_s-1": "1e-8", "rate_hz-1": "1", "energy_j-1": "1",
        "average_power_w-1": "1",
    },
    "second axis only": {**CW, "diameter_mm-1": "", "diameter_y_mm-1": "2"},
    "wrong second axis": {**CW, "diameter_y_mm-1": "-2", "divergence_y_mrad-1": "4000"},
    "unknown rule set": {**CW, "rules": "icnirp-1996"},
    "long label": {**CW, "label": "x" * 201},
    "short exposure": {**CW, "exposure_s": "1e-14", "distance_m": "-1"},
    "waist too far": {**CW, "waist_m-1": "1e7", "subtense_mrad-1": "-1"},
}  # fmt: skip


@pytest.mark.parametrize("fields", MISTAKES.values(), ids=MISTAKES.keys())
def test_the_summary_of_errors_links_to_the_fields(client: Client, fields: dict[str, str]) -> None:
    root = page(client, address(fields), 422)
    assert root.one("head").one("title").text.startswith("Error: ")
    links = root.one("section", role="alert").all("a")
    assert links
    for link in links:
        name = link.attributes["href"].removeprefix("#")
        field = root.by_id(name)
        assert field.tag in ("input", "select")
        assert link.text
    assert len({link.attributes["href"] for link in links}) == len(links)


def test_a_second_axis_alone_is_not_taken_for_the_first(client: Client) -> None:
    root = page(client, address(MISTAKES["second axis only"]), 422)
    assert [a.attributes["href"] for a in root.one("section", role="alert").all("a")] == ["#diameter_mm-1"]


def test_lines_are_added_and_removed(client: Client) -> None:
    added = page(client, ONE + "&change=add-line")
    assert "wavelength_nm-2" in added.ids
    assert added.by_id("wavelength_nm-1").attributes["value"] == "532"
    assert "verdict-title" not in added.ids
    two, place = target(client, ONE + "&change=add-line").split("#")
    assert place == "line-2"
    assert dict(parse_qsl(urlsplit(two).query))["lines"] == "2"
    removed = page(client, two.replace("&edit=1", "") + "&wavelength_nm-2=1064&change=remove-line-2")
    assert "wavelength_nm-2" not in removed.ids
    assert removed.by_id("power_w-1").attributes["value"] == "0.1"


def test_buttons_for_lines(client: Client) -> None:
    def changes(lines: int) -> list[str]:
        root = page(client, f"/evaluate?v=1&lines={lines}&edit=1")
        return [b.attributes["value"] for b in root.all("button", name="change")]

    rest = [*(f"add-element-{e}" for e in ELEMENTS), "add-pair", "add-window"]
    each = ["copy-line-1", "remove-line-1", "copy-line-2", "remove-line-2"]
    assert changes(1) == ["copy-line-1", "add-line", *rest]
    assert changes(2) == [*each, "add-line", *rest]
    assert changes(16) == [*(f"remove-line-{k}" for k in range(1, 17)), *rest]


def test_lines_stay_between_one_and_sixteen(client: Client) -> None:
    assert "lines=1&" in target(client, ONE + "&change=remove-line-1") + "&"
    most = target(client, "/evaluate?v=1&lines=16&change=add-line")
    assert dict(parse_qsl(urlsplit(most).query))["lines"] == "16"


def test_the_blank_form_has_cautions_and_a_version(client: Client) -> None:
    root = page(client, "/")
    assert root.by_id("cautions-title")
    (form,) = root.all("form")
    assert (form.attributes["action"], form.attributes["method"]) == ("/evaluate", "get")
    assert root.one("input", name="v").attributes["value"] == "1"
