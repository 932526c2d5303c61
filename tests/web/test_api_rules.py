"""Rule sets, the description of the API and its examples."""

from __future__ import annotations

import csv
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from service.files import DATA
from tests.web.client import COMPARE, EVALUATE, GOOD, RULES, Client, strict_json
from tests.web.shape import assert_problem

TABLES = ("limits", "factors", "apertures", "durations", "repetition", "additivity")


def csv_rows(rules: str, table: str) -> list[dict[str, str]]:
    """A table as text, read with the standard library alone."""
    name = "additivity.csv" if table == "additivity" else f"{rules}/{table}.csv"
    with Path(DATA / "rules" / name).open(encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))


@pytest.fixture(scope="module")
def documents(client: Client) -> dict[str, dict[str, Any]]:
    found = {rules: client.get(f"/api/v1/rules/{rules}") for rules in RULES}
    assert {r.status_code for r in found.values()} == {200}
    return {rules: strict_json(r.text) for rules, r in found.items()}


def test_list_of_rule_sets(client: Client) -> None:
    listed = strict_json(client.get("/api/v1/rules").text)
    assert tuple(r["id"] for r in listed) == RULES
    for entry in listed:
        head = tomllib.loads((DATA / "rules" / entry["id"] / "ruleset.toml").read_text(encoding="utf-8"))
        for key in ("id", "title", "standing", "standing_text"):
            assert entry[key] == head[key]


@pytest.mark.parametrize("table", TABLES)
@pytest.mark.parametrize("rules", RULES)
def test_rows_are_those_of_the_files(documents: dict[str, Any], rules: str, table: str) -> None:
    given, printed = documents[rules][table], csv_rows(rules, table)
    assert len(given) == len(printed) > 0
    for row, text in zip(given, printed, strict=True):
        assert set(row) == set(text)
        for name, cell in text.items():
            value = row[name]
            if value is None:
                assert cell == ""
            elif isinstance(value, str):
                assert value == cell
            else:
                assert cell, f"{table} {text['row']} {name}: {value} for a blank cell"
                assert value == float(cell)


@pytest.mark.parametrize("rules", RULES)
def test_every_source_that_a_row_names_is_there(documents: dict[str, Any], rules: str) -> None:
    document = documents[rules]
    named = {row["source"] for table in TABLES for row in document[table]}
    assert named <= set(document["sources"])
    for source in document["sources"].values():
        assert source["title"]
        assert source["publisher"]


@pytest.mark.parametrize("rules", RULES)
def test_digest_is_the_same_everywhere(client: Client, documents: dict[str, Any], rules: str) -> None:
    listed = {r["id"]: r["digest"] for r in client.get("/api/v1/rules").json()}
    answer = client.evaluate({**GOOD, "rules": rules})
    digests = {
        documents[rules]["digest"],
        listed[rules],
        answer["rules"]["digest"],
        answer["provenance"]["rules_digest"],
        client.get("/health/ready").json()["rules"][rules],
    }
    assert len(digests) == 1
    (digest,) = digests
    assert f"<code>{digest}</code>" in client.get(f"/rules/{rules}").text
    assert f"<code>{digest}</code>" in client.get("/rules").text


def test_digests_differ_between_sets(documents: dict[str, Any]) -> None:
    assert len({d["digest"] for d in documents.values()}) == len(RULES)


@pytest.mark.parametrize("name", ["icnirp-1996", "ICNIRP-2013", "..", "%2e%2e%2fsources", "x" * 3000])
def test_unknown_rule_set(client: Client, name: str) -> None:
    document = assert_problem(client.get(f"/api/v1/rules/{name}"), 404)
    assert len(document["detail"]) < 4000


@pytest.fixture(scope="module")
def description(client: Client) -> dict[str, Any]:
    response = client.get("/api/v1/openapi.json")
    assert response.status_code == 200
    return dict(strict_json(response.text))


def inside(node: Any) -> Iterator[dict[str, Any]]:
    """Every object of a JSON document."""
    if isinstance(node, dict):
        yield node
        node = list(node.values())
    if isinstance(node, list):
        for part in node:
            yield from inside(part)


def operations(description: dict[str, Any]) -> Iterator[tuple[str, str, dict[str, Any]]]:
    for path, item in description["paths"].items():
        for method, operation in item.items():
            yield path, method, operation


def test_description_is_openapi(description: dict[str, Any]) -> None:
    """OpenAPI 3.1: openapi, info with title and version, paths; a response for every operation."""
    assert description["openapi"].startswith("3.")
    assert description["info"]["title"] == "Blinkline"
    assert description["info"]["version"]
    seen = set()
    for path, method, operation in operations(description):
        assert path.startswith("/")
        assert method in ("get", "post", "put", "delete", "patch")
        assert operation["summary"]
        assert operation["operationId"] not in seen
        seen.add(operation["operationId"])
        assert operation["responses"]
        for status, response in operation["responses"].items():
            assert status.isdecimal()
            assert response["description"]
        names = {p["name"] for p in operation.get("parameters", []) if p["in"] == "path"}
        assert names == {part[1:-1] for part in path.split("/") if part.startswith("{")}


def test_every_reference_of_the_description_resolves(description: dict[str, Any]) -> None:
    references = [n["$ref"] for n in inside(description) if isinstance(n.get("$ref"), str)]
    assert references
    for reference in references:
        assert reference.startswith("#/")
        place: Any = description
        for step in reference[2:].split("/"):
            place = place[step]
        assert isinstance(place, dict)


def test_description_knows_the_calls_of_the_contract(description: dict[str, Any]) -> None:
    known = {(path, method) for path, method, _ in operations(description)}
    assert known >= {
        (EVALUATE, "post"),
        (COMPARE, "post"),
        ("/api/v1/rules", "get"),
        ("/api/v1/rules/{rules_id}", "get"),
        ("/health/live", "get"),
        ("/health/ready", "get"),
    }


@pytest.mark.parametrize("url", [EVALUATE, COMPARE])
def test_every_example_of_a_body_gives_an_answer(
    client: Client, description: dict[str, Any], url: str
) -> None:
    operation = description["paths"][url]["post"]
    assert operation["requestBody"]["required"] is True
    examples = operation["requestBody"]["content"]["application/json"]["examples"]
    assert len(examples) >= 3
    for example in examples.values():
        assert example["summary"]
        assert client.post(url, json=example["value"]).status_code == 200


def test_every_example_of_the_schema_gives_an_answer(client: Client, description: dict[str, Any]) -> None:
    examples = description["components"]["schemas"]["EvaluationRequest"]["examples"]
    assert GOOD in examples
    for example in examples:
        assert client.post(EVALUATE, json=example).status_code == 200


@pytest.mark.parametrize("url", [EVALUATE, COMPARE])
def test_description_tells_of_problems(description: dict[str, Any], url: str) -> None:
    responses = description["paths"][url]["post"]["responses"]
    assert {"200", "400", "413", "415", "422"} <= set(responses)
    for status in ("400", "413", "415", "422"):
        assert set(responses[status]["content"]) == {"application/problem+json"}


def test_description_names_every_field_with_its_bounds(description: dict[str, Any]) -> None:
    """Bounds of contract v1: wavelength 180 to 1e6 nm, exposure 1e-13 to 3e4 s, 1 to 16 lines."""
    schemas = description["components"]["schemas"]
    wavelength = schemas["Line"]["properties"]["wavelength_nm"]
    assert (wavelength["minimum"], wavelength["maximum"]) == (180, 1e6)
    top = schemas["EvaluationRequest"]["properties"]
    exposure = next(s for s in top["exposure_s"]["anyOf"] if s["type"] == "number")
    assert (exposure["minimum"], exposure["maximum"]) == (1e-13, 3e4)
    assert (top["lines"]["minItems"], top["lines"]["maxItems"]) == (1, 16)
    for name in ("Line", "EvaluationRequest", "Cw", "Pulse", "Train", "Beam", "Viewing"):
        assert schemas[name]["additionalProperties"] is False
