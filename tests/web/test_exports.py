"""The answer to take along is the answer of the API."""

from __future__ import annotations

import csv
import io
import json

import pytest

from tests.web.client import Client
from tests.web.pages import CW, address, as_request, page
from tests.web.shape import assert_problem
from tests.web.test_pages import TRAIN, TWO

FORMS = {"continuous": CW, "train": TRAIN, "two lines": TWO}


@pytest.mark.parametrize("fields", FORMS.values(), ids=FORMS.keys())
def test_json_and_csv_are_the_answer(client: Client, fields: dict[str, str]) -> None:
    wanted = client.evaluate(as_request(fields))
    taken = client.get(address(fields).replace("/evaluate", "/evaluate.json"))
    assert json.loads(taken.text) == wanted
    assert 'filename="evaluation.json"' in taken.headers["content-disposition"]
    table = client.get(address(fields).replace("/evaluate", "/evaluate.csv"))
    assert table.headers["content-type"] == "text/csv; charset=utf-8"
    rows = {r["field"]: r for r in csv.DictReader(io.StringIO(table.text))}
    assert float(rows["eye.hazard_distance_m"]["value"]) == wanted["eye"]["hazard_distance_m"]
    assert rows["eye.hazard_distance_m"]["unit"] == "m"
    assert (
        float(rows["inputs.lines.0.wavelength_nm"]["value"]) == wanted["inputs"]["lines"][0]["wavelength_nm"]
    )
    assert rows["rules.digest"]["value"] == wanted["rules"]["digest"]
    assert rows["cautions.0"]["value"] == wanted["cautions"][0]
    for number, criterion in enumerate(wanted["eye"]["criteria"]):
        assert float(rows[f"eye.criteria.{number}.limit_j_m2"]["value"]) == criterion["limit_j_m2"]


@pytest.mark.parametrize("label", ["=1+1", "+1", "-1", "@SUM(A1)", '"a",b', "two\nlines"])
def test_no_text_becomes_a_formula(client: Client, label: str) -> None:
    table = client.get(address({**CW, "label": label}).replace("/evaluate", "/evaluate.csv"))
    rows = {r["field"]: r["value"] for r in csv.DictReader(io.StringIO(table.text, newline=""))}
    assert rows["inputs.label"].removeprefix("'") == label
    assert rows["inputs.label"][0] not in "=+-@"


def test_the_page_links_to_both(client: Client) -> None:
    root = page(client, address(CW))
    for kind in ("json", "csv"):
        (link,) = (
            a.attributes["href"] for a in root.all("a") if f"/evaluate.{kind}?" in a.attributes["href"]
        )
        assert client.get(link).status_code == 200


def test_mistakes_are_problems(client: Client) -> None:
    for kind in ("json", "csv"):
        url = address({**CW, "power_w-1": "much"}).replace("/evaluate", f"/evaluate.{kind}")
        assert_problem(client.get(url), 422, "power_w-1")
        assert_problem(client.get(f"/evaluate.{kind}?v=0"), 400, "v")
