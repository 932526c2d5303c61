"""The report on paper: every figure of the answer, text that stays text, tagged pages, the same bytes."""

from __future__ import annotations

import io
import json
import re
from decimal import Decimal
from functools import cache
from typing import Any
from urllib.parse import parse_qsl

import pdfplumber
import pytest

from service.contract.answer import answer, cautions
from service.contract.report import ReportRequest, day_of
from service.web.report import report_data, report_pdf
from service.web.report_blocks import printable
from service.web.understood import understood
from tests.web.client import EVALUATE, GOOD, JSON, Client, changed, laser, strict_json
from tests.web.markup import one_unit, shown_value
from tests.web.pages import CW, HTML, address
from tests.web.shape import assert_problem

REPORT = "/api/v1/report"
DAY = "2026-12-01"
TRAIN = {"mode": "train", "average_power_w": 0.02, "pulse_s": 1e-7, "rate_hz": 5000}
FULL: dict[str, Any] = {
    **laser(1064, {"mode": "cw", "power_w": 2.0}),
    "label": "Bench 7, through a lens",
    "bench": [{"element": "lens", "focal_mm": 200}],
    "viewing": {"aid": {"objective_mm": 50, "magnification": 7}, "visibility_km": 5.0, "distance_m": 3.0},
    "eyewear": [
        {
            "name": "Pair 7",
            "ranges": [{"from_nm": 1000, "to_nm": 1100, "optical_density": 6, "marking": "D LB6"}],
        }
    ],
    "windows": [{"name": "Hatch", "distance_m": 1.0, "optical_density": 4.0}],
}
CASES = {
    "continuous": GOOD,
    "train at a distance": laser(905, TRAIN, viewing={"distance_m": 2.0}, rules="eu-2006-25"),
    "everything": FULL,
    "lit spot": {
        **laser(532, {"mode": "cw", "power_w": 20.0}),
        "bench": [{"element": "diffuser", "reflectance": 0.8}],
    },
    "outdoors": {**GOOD, "viewing": {"outdoors": True}},
    "sweeping beam": {
        **laser(532, {"mode": "cw", "power_w": 0.1}),
        "bench": [{"element": "scanner", "angle_deg": 20, "sweeps_hz": 50}],
    },
    "two lines": {"lines": [GOOD["lines"][0], laser(905, TRAIN)["lines"][0]], "rules": "ansi-z136-1-2014"},
    "no spread": changed("lines.0.beam.divergence_mrad", 0),
    "faint": changed("lines.0.emission.power_w", 1e-11),
}


def request_for(body: dict[str, Any], paper: str = "a4", **more: str) -> ReportRequest:
    return ReportRequest.model_validate({"evaluation": body, "paper": paper, "date": DAY, **more})


@cache
def made(case: str, paper: str = "a4") -> bytes:
    return report_pdf(request_for(CASES[case], paper), day_of(DAY))


@cache
def pages(document: bytes, most: int = 99) -> list[str]:
    with pdfplumber.open(io.BytesIO(document)) as opened:
        return [page.extract_text() for page in opened.pages[:most]]


def flat(text: str) -> str:
    """Without blanks, and without the places at which a long word may break."""
    return re.sub(r"[\s\u200b]+", "", text)


def cells(data: dict[str, Any]) -> list[str]:
    """Every piece of text that the template gets, runs joined as 1.2 × 10^-5."""
    found: list[str] = []

    def walk(value: Any) -> None:
        if isinstance(value, str):
            found.append(value)
        elif isinstance(value, dict):
            for name, inner in value.items():
                if name not in ("svg", "kind"):
                    walk(inner)
        elif isinstance(value, list):
            if value and all(
                isinstance(v, list) and len(v) == 2 and v[1] in ("", "sup", "sub") for v in value
            ):
                found.append("".join(f"^{t}" if place == "sup" else t for t, place in value))
            else:
                for inner in value:
                    walk(inner)

    walk(data["parts"])
    return found


NUMBER = re.compile(r"(?<![\d.])\d+(?:\.\d+)?(?: × 10[⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+)?")
FIGURE = re.compile(r"(?<![\w.])(\d+(?:\.\d+)?)(?: × 10\^(−?\d+))?(?![\w.]*\d)")


def figures(text: str) -> list[Decimal]:
    return [Decimal(m[1]).scaleb(int((m[2] or "0").replace("−", "-"))) for m in FIGURE.finditer(text)]


def assert_shown(texts: str, value: float, up: bool, what: str) -> None:
    """A figure of the JSON stands among the cells, rounded to three digits on the safe side."""
    exact = Decimal(repr(value))
    if exact == 0:
        return
    for shown in figures(texts):
        off = shown - exact if up else exact - shown
        if 0 <= off < one_unit(exact):
            return
    raise AssertionError(f"{what} = {value} is not among the figures")


@pytest.mark.parametrize("case", CASES)
def test_every_figure_of_the_answer_is_in_the_report(client: Client, case: str) -> None:
    found = client.evaluate(CASES[case])
    texts = "\n".join(cells(report_data(request_for(CASES[case]), day_of(DAY))))
    for target in ("eye", "skin", "eye_aided"):
        if found[target] is None:
            continue
        answered = found[target]
        if answered["hazard_distance_m"] is None:
            assert "unbounded" in texts
        else:
            assert_shown(texts, answered["hazard_distance_m"], True, f"{target} distance")
        for name in ("hazard_ratio", "optical_density"):
            assert_shown(texts, answered[name], True, f"{target} {name}")
        for criterion in answered["criteria"]:
            assert_shown(texts, criterion["limit_j_m2"], False, "limit_j_m2")
            assert_shown(texts, criterion["limit_w_m2"], False, "limit_w_m2")
            assert_shown(texts, criterion["hazard_ratio"], True, "hazard_ratio")
            assert criterion["source"] in texts
        there = answered["at_distance"]
        if there is not None:
            assert_shown(texts, there["hazard_ratio"], True, "ratio at the distance")
            assert_shown(texts, there["optical_density"], True, "density at the distance")
    if found["diffuse"] is not None:
        assert_shown(texts, found["diffuse"]["day_hazard_ratio"], True, "a day at the spot")
    for zone in found["airspace"]["zones"] if found["airspace"] else []:
        assert_shown(texts, zone["distance_m"], True, zone["name"])
        assert_shown(texts, zone["level_w_m2"], False, zone["name"])
    if found["scan"] is not None:
        for name in ("hazard_distance_m", "hazard_ratio", "optical_density"):
            assert_shown(texts, found["scan"]["failure_eye"][name], True, f"stopped {name}")
    for line in found["protection"]["lines"]:
        assert_shown(texts, line["worst_place"]["optical_density"], True, "density")
        assert_shown(texts, line["worst_place"]["transmittance"], False, "transmittance")
    for pair in found["protection"]["eyewear"]:
        assert_shown(texts, pair["remaining_ratio"], True, "behind the pair")
    for scheme in found["classification"]:
        assert f"Class {scheme['hazard_class']}" in texts
        assert scheme["digest"] in texts
    for n in found["notices"]:
        assert n["text"] in texts
    for name in ("rules_digest", "request_digest", "eyewear_digest"):
        assert found["provenance"][name] in texts
    assert f"Blinkline {found['provenance']['service_version']}" in texts


@pytest.mark.parametrize("case", ["everything", "train at a distance", "faint"])
def test_every_figure_of_the_data_is_on_the_pages(case: str) -> None:
    """What the template gets is what stands on paper: tables, criteria and working alike."""
    data = report_data(request_for(CASES[case]), day_of(DAY))
    paper = flat("".join(pages(made(case))))
    for block in (b for part in data["parts"] for b in part if b["kind"] == "table"):
        for row in block["rows"]:
            # Raised and lowered pieces stand on lines of their own in extracted text.
            for piece, place in (run for content in row for run in content):
                if place == "" and re.fullmatch(r"[\d.]+( m)?", piece):
                    assert flat(piece) in paper, piece


@pytest.mark.parametrize(("case", "paper"), [("everything", "a4"), ("continuous", "letter")])
def test_each_page_has_its_number_and_the_caution(case: str, paper: str) -> None:
    document = made(case, paper)
    texts = pages(document)
    for k, text in enumerate(texts):
        assert f"Page {k + 1} of {len(texts)}" in text
        assert "does not replace it" in text
        assert "Never look into a beam" in text
        assert "sha256:" in text
    whole = flat("".join(texts))
    for caution in cautions():
        assert flat(caution) in whole
    assert "Signatures" in "".join(texts)
    with pdfplumber.open(io.BytesIO(document)) as opened:
        # ISO 216 A4 is 210 mm x 297 mm; Letter is 8.5 in x 11 in.
        size = (595.28, 841.89) if paper == "a4" else (612.0, 792.0)
        assert (opened.pages[0].width, opened.pages[0].height) == pytest.approx(size, abs=0.1)
        for page in opened.pages:
            assert all(c["x0"] > 0 and c["x1"] < page.width for c in page.chars)
            # Nothing of the text runs into the caution at the foot.
            assert all(c["bottom"] < page.height for c in page.chars)


def test_document_is_tagged_titled_and_describes_its_chart() -> None:
    document = made("everything")
    with pdfplumber.open(io.BytesIO(document)) as opened:
        assert opened.metadata["Title"] == "Laser hazard evaluation: Bench 7, through a lens"
        assert opened.metadata["CreationDate"].startswith("D:20261201")
        assert opened.doc.catalog["MarkInfo"]["Marked"] is True
        assert opened.doc.catalog["Lang"] == b"en"
        tags = json.dumps([page.structure_tree for page in opened.pages], default=str)
    assert b"<pdfuaid:part>1</pdfuaid:part>" in document
    for tag in ("H1", "H2", "Table", "TH", "TD", "L", "LI", "Figure"):
        assert f'"type": "{tag}"' in tags, tag
    assert "above the limit out to" in tags


def test_text_of_users_stays_text() -> None:
    texts = [
        '#read("/etc/passwd")',
        "<script>alert(1)</script>",
        "*b* _i_ `c` $x$ = h // no",
        "[U+0041] #panic()",
    ]
    label, place, asked_by, name = texts
    body = {**FULL, "label": label, "eyewear": [{**FULL["eyewear"][0], "name": name}]}
    document = report_pdf(request_for(body, place=place, asked_by=asked_by), day_of(DAY))
    whole = flat("".join(pages(document, 2)).replace("“", '"').replace("”", '"'))
    assert all(flat(text) in whole for text in texts)
    assert whole.count(flat(label)) >= 3
    assert "root:" not in whole


def test_long_words_and_many_parts_stay_on_the_paper() -> None:
    pair = {"name": "M" * 200, "ranges": [{"from_nm": 300, "to_nm": 1100, "optical_density": 6}]}
    window = {"name": "Q" * 200, "distance_m": 1.0, "optical_density": 4.0}
    body = {**GOOD, "label": "W" * 200, "eyewear": [pair] * 3, "windows": [window] * 3}
    document = report_pdf(request_for(body, place="P" * 200, asked_by="b" * 200), day_of(DAY))
    with pdfplumber.open(io.BytesIO(document)) as opened:
        margin = 18 / 25.4 * 72
        for page in opened.pages[:4]:
            assert max(c["x1"] for c in page.chars) <= page.width - margin + 0.5
    whole = flat("".join(pages(document, 4)))
    assert all(whole.count(letter * 100) >= 1 for letter in "WPb")


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("שלום", "[U+05E9][U+05DC][U+05D5][U+05DD]"),
        ("beam \U0001f600", "beam [U+1F600]"),
        ("a\u202eb", "a[U+202E]b"),
        ("e\u0301", "é"),
    ],
)
def test_what_cannot_be_printed_stands_as_code_points(text: str, shown: str) -> None:
    assert printable(text) == shown
    texts = pages(report_pdf(request_for({**GOOD, "label": text}), day_of(DAY)), 1)
    assert flat(shown) in flat(texts[0])
    assert ("stand as their code points" in " ".join(texts[0].split())) == ("[U+" in shown)


@pytest.mark.parametrize("case", CASES)
def test_own_words_can_all_be_printed(case: str) -> None:
    assert "[U+" not in json.dumps(report_data(request_for(CASES[case]), day_of(DAY)))


def test_same_request_same_bytes_whatever_the_clock(client: Client) -> None:
    body = {"evaluation": FULL, "paper": "letter", "date": DAY, "place": "Room 3"}
    first, second = (client.post(REPORT, json=body) for _ in range(2))
    assert first.status_code == 200, first.text
    assert first.headers["content-type"] == "application/pdf"
    assert (
        first.headers["content-disposition"]
        == 'inline; filename="laser-evaluation-bench-7-through-a-lens.pdf"'
    )
    assert first.content == second.content
    other = client.post(REPORT, json={**body, "date": "2026-12-02"})
    assert other.content != first.content
    assert "2026-12-02" in pages(other.content, 1)[0]


def test_report_without_a_day_bears_the_present_one(client: Client) -> None:
    response = client.post(REPORT, json={"evaluation": GOOD})
    assert response.status_code == 200
    assert re.search(r"Date\s+20\d\d-\d\d-\d\d", pages(response.content, 1)[0])


@pytest.mark.parametrize(
    ("body", "field"),
    [
        ({}, "evaluation"),
        ({"evaluation": changed("lines.0.wavelength_nm", 5)}, "evaluation.lines.0.wavelength_nm"),
        ({"evaluation": GOOD, "paper": "a3"}, "paper"),
        ({"evaluation": GOOD, "date": "1 December"}, "date"),
        ({"evaluation": GOOD, "date": "2026-02-30"}, "date"),
        ({"evaluation": GOOD, "date": "1999-12-31"}, "date"),
        ({"evaluation": GOOD, "place": "x" * 201}, "place"),
        ({"evaluation": GOOD, "colour": "red"}, "colour"),
    ],
)
def test_api_refuses_by_name(client: Client, body: Any, field: str) -> None:
    assert_problem(client.post(REPORT, json=body), 422, field)
    assert_problem(client.post(REPORT, content=b"[", headers=JSON), 400)


def test_page_leads_to_its_report_on_both_papers(client: Client) -> None:
    text = client.get(address(CW), headers=HTML).text
    for paper in ("a4", "letter"):
        (link,) = re.findall(rf'href="(/report\?[^"]*paper={paper})"', text)
        moved = client.get(link.replace("&amp;", "&"))
        assert moved.status_code == 303
        query = dict(parse_qsl(moved.headers["location"].partition("?")[2]))
        assert query["paper"] == paper
        assert re.fullmatch(r"\d{4}-\d{2}-\d{2}", query["date"])
        response = client.get(moved.headers["location"])
        assert response.headers["content-type"] == "application/pdf"
        whole = " ".join(pages(response.content, 1)[0].split())
        assert "Bench 4 alignment beam" in whole
        assert "The setup as given" in whole
        assert response.content == client.get(moved.headers["location"]).content


@pytest.mark.parametrize("more", ["paper=a3", "date=soon", "colour=1", "paper=a4&paper=a4"])
def test_unknown_parameters_are_refused(client: Client, more: str) -> None:
    response = client.get(f"{address(CW)}&{more}".replace("/evaluate?", "/report?"))
    assert response.status_code == 400
    assert response.json()["type"] == "/problems/bad-address"


def test_unfinished_laser_leads_back_to_its_form(client: Client) -> None:
    response = client.get(address({**CW, "power_w-1": ""}).replace("/evaluate?", "/report?"))
    while response.headers["location"].startswith("/report?"):
        response = client.get(response.headers["location"])
    assert response.headers["location"].startswith("/evaluate?")
    assert client.get("/report").headers["location"] == "/"


def test_every_input_is_understood_in_words(client: Client) -> None:
    """Every leaf of the inputs stands among the rows: nothing that was sent is passed over."""
    for body in CASES.values():
        inputs = client.evaluate(body)["inputs"]
        parts = understood(inputs, {inputs["rules"]: "the rule set"})
        shown = " ".join(f"{name} {value}" for _, rows in parts for name, value in rows)
        leaves: list[Any] = []

        def walk(value: Any, leaves: list[Any] = leaves) -> None:
            if isinstance(value, dict | list):
                for inner in value.values() if isinstance(value, dict) else value:
                    walk(inner)
            elif isinstance(value, float):
                leaves.append(value)

        walk(inputs)
        shown = re.sub(r"(?<!× )\b10(?=[⁻⁰¹²³⁴⁵⁶⁷⁸⁹])", "1 × 10", shown)
        for value in leaves:
            assert any(shown_value(f) == Decimal(repr(value)) for f in re.findall(NUMBER, shown)), value


@pytest.mark.parametrize(
    ("basis", "words"),
    [("bound", "bound, not measured"), ("data_sheet", "data sheet"), ("measured", "measured")],
)
def test_report_says_where_the_figures_come_from(client: Client, basis: str, words: str) -> None:
    inputs = client.evaluate({**GOOD, "basis": basis})["inputs"]
    (_, rows), *_ = understood(inputs, {inputs["rules"]: "the rule set"})
    assert ("Where the figures come from", words) in rows


def test_description_names_the_body(client: Client) -> None:
    document = strict_json(client.get("/api/v1/openapi.json").text)
    body = document["paths"][REPORT]["post"]["requestBody"]["content"]["application/json"]
    assert body["schema"]["$ref"].endswith("/ReportRequest")
    assert client.post(REPORT, json=body["example"]).status_code == 200
    assert client.post(EVALUATE, json=body["example"]["evaluation"]).status_code == 200


def test_report_rests_on_the_answer_of_the_api(client: Client) -> None:
    data = report_data(request_for(GOOD), day_of(DAY))
    assert data["digest"] == client.evaluate(GOOD)["provenance"]["request_digest"]
    assert data["digest"] == answer(request_for(GOOD).evaluation).provenance.request_digest
