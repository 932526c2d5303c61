"""Sweeps over the API, on the page and as CSV: the same figures."""

from __future__ import annotations

import csv
import io
from typing import Any
from urllib.parse import parse_qsl, urlencode

import pytest

from tests.web.client import EVALUATE, GOOD, JSON, Client, changed, strict_json
from tests.web.markup import Element, parse
from tests.web.pages import CW, HTML, address
from tests.web.shape import assert_problem
from tests.web.test_pages import TRAIN, TWO, assert_figure

SWEEP = "/api/v1/sweep"
ASKED = {"field": "power_w", "start": 1e-4, "stop": 10.0, "points": 11}
BODY: dict[str, Any] = {"evaluation": GOOD, "sweep": ASKED}


def at(fields: dict[str, str], **own: str) -> str:
    more = urlencode({f"sweep-{name}": value for name, value in own.items()})
    return address(fields).replace("/evaluate?", "/sweep?") + (f"&{more}" if more else "")


def page(client: Client, url: str, status: int = 200) -> Element:
    response = client.get(url, headers=HTML, follow_redirects=True)
    assert response.status_code == status, response.text[:300]
    return parse(response.text)


def test_api_answers_with_lists_along_the_values(client: Client) -> None:
    response = client.post(SWEEP, json=BODY)
    assert response.status_code == 200, response.text
    found = strict_json(response.text)
    assert found["values"][0] == 1e-4
    assert found["values"][-1] == 10.0
    for target in (found["eye"], found["skin"]):
        assert {len(column) for column in target.values()} == {11}
    assert {len(names) for names in found["hazard_class"].values()} == {11}
    single = client.evaluate(changed("lines.0.emission.power_w", found["values"][7]))
    assert found["eye"]["hazard_distance_m"][7] == pytest.approx(single["eye"]["hazard_distance_m"], rel=1e-9)
    assert found["rules"]["digest"] == single["rules"]["digest"]
    assert found["cautions"] == single["cautions"]


def test_api_gives_the_same_as_csv(client: Client) -> None:
    found = strict_json(client.post(SWEEP, json=BODY).text)
    response = client.post(SWEEP, json=BODY, headers={"accept": "text/csv"})
    assert response.headers["content-type"].startswith("text/csv")
    rows = list(csv.DictReader(io.StringIO(response.text, newline="")))
    assert [float(r["power_w"]) for r in rows] == found["values"]
    for k, row in enumerate(rows):
        for target in ("eye", "skin"):
            assert float(row[f"{target}_hazard_ratio"]) == found[target]["hazard_ratio"][k]
            assert float(row[f"{target}_hazard_distance_m"]) == found[target]["hazard_distance_m"][k]
            assert row[f"{target}_row"] == found[target]["row"][k]
        assert row["rules_digest"] == found["rules"]["digest"]
        assert row["class_iec-60825-1-2014"] == found["hazard_class"]["iec-60825-1-2014"][k]


def test_zone_without_end_is_said_in_words(client: Client) -> None:
    body = {"evaluation": changed("lines.0.beam.divergence_mrad", 0.0), "sweep": {**ASKED, "points": 3}}
    rows = client.post(SWEEP, json=body, headers={"accept": "text/csv"}).text.splitlines()
    assert "unbounded" in rows[-1]
    assert strict_json(client.post(SWEEP, json=body).text)["eye"]["hazard_distance_m"][-1] is None


@pytest.mark.parametrize(
    ("body", "field"),
    [
        ({"sweep": ASKED}, "evaluation"),
        ({"evaluation": GOOD}, "sweep"),
        ({**BODY, "more": 1}, "more"),
        ({**BODY, "evaluation": changed("lines.0.wavelength_nm", 10)}, "evaluation.lines.0.wavelength_nm"),
        ({**BODY, "evaluation": {"lines": []}}, "evaluation.lines"),
        ({**BODY, "evaluation": changed("rules", "none")}, "rules"),
        ({**BODY, "evaluation": 5}, "evaluation"),
        ({**BODY, "sweep": {**ASKED, "field": "label"}}, "sweep.field"),
        ({**BODY, "sweep": {**ASKED, "points": 5001}}, "sweep.points"),
        ({**BODY, "sweep": {**ASKED, "points": 1}}, "sweep.points"),
        ({**BODY, "sweep": {**ASKED, "stop": 1e-5}}, "sweep"),
        ({**BODY, "sweep": {**ASKED, "start": 0}}, "sweep"),
        ({**BODY, "sweep": {**ASKED, "start": "1"}}, "sweep.start"),
        ({**BODY, "sweep": {**ASKED, "spacing": "even"}}, "sweep.spacing"),
        ([], "body"),
    ],
)
def test_api_refuses_by_name(client: Client, body: Any, field: str) -> None:
    assert_problem(client.post(SWEEP, json=body), 422, field)


def test_api_reads_bodies_as_strictly_as_elsewhere(client: Client) -> None:
    assert_problem(client.post(SWEEP, content=b"{", headers=JSON), 400)
    assert_problem(client.post(SWEEP, content=b'{"a": 1, "a": 2}', headers=JSON), 422, "a")
    assert_problem(client.post(SWEEP, content=b"x", headers={"content-type": "text/plain"}), 415)


def test_description_names_the_body(client: Client) -> None:
    document = strict_json(client.get("/api/v1/openapi.json").text)
    body = document["paths"][SWEEP]["post"]["requestBody"]["content"]["application/json"]
    assert body["schema"]["$ref"].endswith("/SweepRequest")
    assert client.post(SWEEP, json=body["example"]).status_code == 200
    assert client.post(EVALUATE, json=body["example"]["evaluation"]).status_code == 200


@pytest.mark.parametrize(
    ("fields", "own"),
    [(CW, {}), (CW, {"field": "wavelength_nm"}), (TRAIN, {"field": "rate_hz"}), (TWO, {"line": "2"})],
)
def test_page_shows_the_figures_of_the_api(
    client: Client, fields: dict[str, str], own: dict[str, str]
) -> None:
    response = client.get(at(fields, **own), headers=HTML)
    assert response.status_code == 303
    url = response.headers["location"]
    root = page(client, url)
    rows = list(
        csv.DictReader(io.StringIO(client.get(url.replace("/sweep?", "/sweep.csv?")).text, newline=""))
    )
    field = dict(parse_qsl(url.partition("?")[2]))["sweep-field"]
    by_value = {float(row[field]): row for row in rows}
    table = root.by_id("sweep-rows").one("tbody").all("tr")
    assert len(table) == 21
    for row in table:
        exact = by_value[float(row.one("th").text)]
        cells = row.all("td")[1:]
        for target, part in (("eye", cells[:6]), ("skin", cells[6:])):
            names = ("hazard_distance_m", "hazard_ratio", "optical_density", "limit_j_m2", "limit_w_m2")
            for cell, name in zip(part, names, strict=False):
                assert_figure(
                    cell.one("data"), float(exact[f"{target}_{name}"]), up=not name.startswith("limit")
                )
    assert root.one("head").one("title").text.endswith("Blinkline")
    assert "Caution" in root.one("section", class_="cautions").text
    assert 2 <= len(root.all("figure", class_="chart")) <= 3
    assert len(root.ids) == len(set(root.ids))


def test_address_of_a_sweep_leads_back_to_the_evaluation(client: Client) -> None:
    root = page(client, at({"distance_m": "2", **CW}))
    (link,) = {a.attributes["href"] for a in root.all("a") if a.text == "Back to the evaluation"}
    assert client.get(link, headers=HTML).status_code == 200
    choices = root.one("nav", class_="sweep-choices").all("a")
    assert [a.text for a in choices] == [
        "Wavelength",
        "Power",
        "Beam diameter",
        "Divergence",
        "Exposure duration",
    ]
    for link in choices:
        page(client, link.attributes["href"])


def test_class_changes_are_enclosed_by_neighbouring_values(client: Client) -> None:
    """Class 3B of visible continuous light ends at 0.5 W (IEC 60825-1 Table 8, from memory)."""
    root = page(client, at(CW, start="0.3", stop="0.7", points="41", spacing="linear"))
    rows = root.all("table", class_="class-steps")[0].one("tbody").all("tr")
    assert [r.one("th").text for r in rows] == ["3B", "4"]
    last, first = float(rows[0].all("td")[1].text), float(rows[1].all("td")[0].text)
    assert last <= 0.5 < first
    assert first - last == pytest.approx(0.01)


@pytest.mark.parametrize(
    ("own", "field"),
    [
        ({"start": "1,064"}, "start"),
        ({"stop": "x"}, "stop"),
        ({"start": "5", "stop": "1"}, "stop"),
        ({"points": "1"}, "points"),
        ({"points": "9999"}, "points"),
        ({"start": "0"}, "start"),
        ({"field": "wavelength_nm", "start": "10"}, "start"),
    ],
)
def test_what_cannot_be_used_is_named_beside_its_field(
    client: Client, own: dict[str, str], field: str
) -> None:
    root = page(client, at(CW, **own), 422)
    (link,) = root.one("section", class_="summary").all("a")
    assert link.attributes["href"] == f"#sweep.{field}"
    assert root.by_id(f"sweep.{field}").attributes["aria-invalid"] == "true"
    assert root.all("figure") == []


@pytest.mark.parametrize(
    "own",
    [{"colour": "1"}, {"field": "label"}, {"line": "2"}, {"spacing": "x"}, {"field": "rate_hz"}],
)
def test_unknown_parameters_are_refused(client: Client, own: dict[str, str]) -> None:
    for path in ("/sweep?", "/sweep.csv?"):
        response = client.get(at(CW, **own).replace("/sweep?", path))
        assert response.status_code == 400
        assert response.json()["type"] == "/problems/bad-address"


def test_blank_start_and_unfinished_laser(client: Client) -> None:
    assert "evaluation" in page(client, "/sweep").one("main").text
    for path in ("/sweep?", "/sweep.csv?"):
        unfinished = client.get(at({**CW, "power_w-1": ""}).replace("/sweep?", path), headers=HTML)
        assert unfinished.status_code == 303
        assert unfinished.headers["location"].startswith("/evaluate?")
