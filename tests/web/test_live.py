"""The answer that refreshes: the same as the page, the same address, and never a stale one."""

from __future__ import annotations

from typing import Any
from urllib.parse import parse_qsl

import pytest

from tests.web.client import Client
from tests.web.markup import parse
from tests.web.pages import CW, address, page
from tests.web.protection_forms import FORMS
from tests.web.shape import assert_problem
from tests.web.test_addresses import ONE


def live(client: Client, fields: dict[str, str]) -> dict[str, Any]:
    response = client.get(address(fields).replace("/evaluate", "/live"))
    assert response.status_code == 200
    assert response.headers["content-type"] == "application/json"
    assert response.headers["cache-control"] == "no-store"
    reply: dict[str, Any] = response.json()
    return reply


@pytest.mark.parametrize("filled", FORMS.values(), ids=FORMS.keys())
def test_the_fragment_is_the_answer_of_the_page(client: Client, filled: Any) -> None:
    reply = live(client, filled.fields)
    whole = page(client, reply["address"])
    part = parse(reply["answer"])
    figures = [(d.attributes["value"], d.text) for d in whole.by_id("answer").all("data")]
    assert [(d.attributes["value"], d.text) for d in part.all("data")] == figures
    assert part.text == whole.by_id("answer").text
    assert whole.one("head").one("title").text == reply["title"]
    assert whole.one("h1").text == reply["named"]
    assert reply["answered"] is True
    assert reply["error"] == {}
    for name, text in live(client, dict(parse_qsl(reply["address"].partition("?")[2])))["echo"].items():
        assert whole.by_id(name).text == text


def test_the_address_is_the_one_of_the_form(client: Client) -> None:
    assert live(client, {**CW, "power_w-1": "1e-1", "waist_m-1": ""})["address"] == ONE


def test_a_form_not_yet_filled_is_no_mistake(client: Client) -> None:
    reply = live(client, {"lines": "1", "mode-1": "cw", "wavelength_nm-1": "532"})
    part = parse(reply["answer"])
    assert not reply["answered"]
    assert reply["error"] == {}
    assert [a.attributes["href"] for a in part.all("a")] == [
        "#power_w-1", "#diameter_mm-1", "#divergence_mrad-1",
    ]  # fmt: skip
    assert "cautions-title" in part.ids
    assert part.all("data") == []
    again = page(client, reply["address"])
    assert again.by_id("wavelength_nm-1").attributes["value"] == "532"
    assert again.all("section", role="alert") == []


def test_mistakes_are_named_and_no_figure_is_shown(client: Client) -> None:
    reply = live(client, {**CW, "wavelength_nm-1": "1,064"})
    assert list(reply["error"]) == ["wavelength_nm-1"]
    assert "1.064 or 1064" in reply["error"]["wavelength_nm-1"]
    part = parse(reply["answer"])
    assert part.all("data") == []
    assert "Nothing was computed" in part.text
    assert reply["said"].startswith("Nothing was computed")


def test_it_says_the_answer_in_a_sentence(client: Client) -> None:
    said = live(client, CW)["said"]
    assert "unsafe out to 99.8 m" in said
    assert "Class 3B" in said


def test_bad_parameters_are_refused_as_on_the_page(client: Client) -> None:
    assert_problem(client.get("/live?v=1&colour=green"), 400, "colour")
    assert_problem(client.get("/live"), 400, "v")
