"""POST /api/v1/evaluate/bulk: records in order, problems in their place, a closing record last."""

from __future__ import annotations

import copy
import gzip
import json
import zlib
from typing import Any

import httpx
import pytest

from service.bulk.summary import Closing, ProblemRecord, Summary
from service.contract.evaluation import EvaluationResult
from tests.web.client import EVALUATE, GOOD, Client, changed, strict_json

BULK = "/api/v1/evaluate/bulk"
LINES = {"content-type": "application/x-ndjson"}
ARRAY = {"content-type": "application/json"}


def lines(*bodies: Any) -> bytes:
    return b"".join((b if isinstance(b, bytes) else json.dumps(b).encode()) + b"\n" for b in bodies)


def records(answer: httpx.Response) -> tuple[list[dict[str, Any]], Closing]:
    """The records of an answer and its closing one."""
    assert answer.status_code == 200, answer.text
    assert answer.headers["content-type"] == "application/x-ndjson"
    *found, last = [strict_json(line) for line in answer.text.splitlines()]
    closing = Closing.model_validate(last["closing"])
    assert list(last) == ["closing"]
    assert closing.lasers == len(found) == closing.answered + closing.problems
    assert [record["index"] for record in found] == list(range(len(found)))
    return found, closing


def test_problems_stand_in_their_place(client: Client) -> None:
    sent = lines(
        GOOD,
        b"{",
        changed("lines.0.wavelength_nm", 20),
        changed("rules", "none-such"),
        b'{"lines": [], "lines": []}',
        changed("lines.0.wavelength_nm", 1064),
    )
    found, closing = records(client.post(BULK, content=sent, headers=LINES))
    assert [("problem" in record) for record in found] == [False, True, True, True, True, False]
    first, malformed, outside, unknown, twice, last = found
    assert Summary.model_validate(first).label == GOOD["label"]
    assert last["eye"]["hazard_distance_m"] != first["eye"]["hazard_distance_m"]
    for record in (malformed, outside, unknown, twice):
        ProblemRecord.model_validate(record)
    assert malformed["problem"]["type"] == "/problems/malformed-body"
    assert outside["problem"]["errors"][0]["field"] == "lines.0.wavelength_nm"
    assert outside["problem"]["errors"][0]["value"] == 20
    assert unknown["problem"]["errors"][0]["field"] == "rules"
    assert "icnirp-2013" in unknown["problem"]["errors"][0]["allowed"]
    assert twice["problem"]["errors"][0]["message"] == "this field stands twice"
    assert (closing.answered, closing.problems, closing.complete) == (2, 4, True)
    assert [info.id for info in closing.rules] == ["icnirp-2013"]
    assert closing.rules[0].standing
    assert closing.cautions


def test_each_problem_is_that_of_the_single_call(client: Client) -> None:
    bad = [changed("lines.0.wavelength_nm", "x"), changed("lines.0.emission.power_w", -1), {}, 7, []]
    found, _ = records(client.post(BULK, content=lines(*bad), headers=LINES))
    for body, record in zip(bad, found, strict=True):
        assert record["problem"] == client.post(EVALUATE, json=body).json()


def test_an_array_is_the_same_as_lines(client: Client) -> None:
    bodies = [GOOD, changed("rules", "eu-2006-25"), {}, changed("label", "Zürich \\ud83d")]
    by_lines = client.post(BULK, content=lines(*bodies), headers=LINES)
    by_array = client.post(BULK, content=json.dumps(bodies, indent=1), headers=ARRAY)
    assert by_lines.text == by_array.text
    found, closing = records(by_array)
    assert [info.id for info in closing.rules] == ["icnirp-2013", "eu-2006-25"]
    assert found[3]["label"] == bodies[3]["label"]


def test_full_records_are_the_single_answers(client: Client) -> None:
    bodies = [GOOD, changed("lines.0.wavelength_nm", 1064), changed("viewing.distance_m", 3.0)]
    found, _ = records(client.post(f"{BULK}?detail=full", content=lines(*bodies), headers=LINES))
    for index, (body, record) in enumerate(zip(bodies, found, strict=True)):
        assert record.pop("index") == index
        assert record == client.evaluate(body)
        EvaluationResult.model_validate(record)


def test_many_requests_cross_the_passes_in_order(client: Client) -> None:
    bodies = []
    for k in range(2345):
        body = copy.deepcopy(GOOD)
        body["label"] = f"laser {k}"
        body["lines"][0]["emission"]["power_w"] = 1e-3 * (1 + k % 7)
        bodies.append(body)
    found, closing = records(client.post(BULK, content=lines(*bodies), headers=LINES))
    assert [record["label"] for record in found] == [body["label"] for body in bodies]
    assert closing.answered == 2345
    assert all(found[k]["eye"] == found[k % 7]["eye"] for k in range(2345))


@pytest.mark.parametrize("content", [b"", b"\n\n \r\n", b"[]", b" [ ] "])
def test_nothing_sent_is_answered_by_a_closing_record(client: Client, content: bytes) -> None:
    headers = ARRAY if content.strip().startswith(b"[") else LINES
    found, closing = records(client.post(BULK, content=content, headers=headers))
    assert (found, closing.complete) == ([], True)


@pytest.mark.parametrize(
    ("tail", "where"),
    [(b"", "column"), (b",]", "Expecting value"), (b" 1]", "Expecting ','"), (b"] x", "Extra data")],
)
def test_an_array_that_breaks_off_says_so(client: Client, tail: bytes, where: str) -> None:
    content = b"[" + json.dumps(GOOD).encode() + tail
    found, closing = records(client.post(BULK, content=content, headers=ARRAY))
    assert len(found) == 1
    assert not closing.complete
    assert closing.stopped is not None
    assert where in closing.stopped


def test_an_array_goes_on_after_an_item_that_cannot_be_used(client: Client) -> None:
    content = b'[{"a": 1, "a": 2}, "\\ud800", ' + json.dumps(GOOD).encode() + b"]"
    found, closing = records(client.post(BULK, content=content, headers=ARRAY))
    assert ["problem" in record for record in found] == [True, True, False]
    assert closing.complete


@pytest.mark.parametrize("content", [json.dumps(GOOD).encode(), b"", b"[\xff]"])
def test_what_is_no_array_is_refused(client: Client, content: bytes) -> None:
    answer = client.post(BULK, content=content, headers=ARRAY)
    assert answer.status_code == 400
    assert answer.json()["type"] == "/problems/malformed-body"


def test_gzip_in_and_out(client: Client) -> None:
    sent = lines(*[GOOD] * 300)
    plain = client.post(BULK, content=sent, headers={**LINES, "accept-encoding": "identity"})
    assert "content-encoding" not in plain.headers
    for packed in (gzip.compress(sent), gzip.compress(sent[:1000]) + gzip.compress(sent[1000:])):
        answer = client.post(
            BULK, content=packed, headers={**LINES, "content-encoding": "gzip", "accept-encoding": "gzip"}
        )
        assert answer.headers["content-encoding"] == "gzip"
        assert answer.text == plain.text


def test_gzip_that_is_refused_is_not_sent(client: Client) -> None:
    for refused in ("gzip;q=0", "gzip; q=0.0", "br"):
        answer = client.post(BULK, content=lines(GOOD), headers={**LINES, "accept-encoding": refused})
        assert "content-encoding" not in answer.headers
        records(answer)


def problem(answer: httpx.Response, status: int, slug: str) -> dict[str, Any]:
    assert answer.status_code == status
    assert answer.headers["content-type"] == "application/problem+json"
    found: dict[str, Any] = answer.json()
    assert found["type"] == f"/problems/{slug}"
    return found


def test_a_small_body_that_unpacks_to_a_large_one_is_refused(client: Client) -> None:
    packer = zlib.compressobj(9, wbits=31)
    bomb = b"".join(packer.compress(b" " * 1_000_000) for _ in range(60)) + packer.flush()
    assert len(bomb) < 100_000
    answer = client.post(BULK, content=bomb, headers={**LINES, "content-encoding": "gzip"})
    assert "50000000 bytes" in problem(answer, 413, "body-too-large")["detail"]


@pytest.mark.parametrize(
    ("headers", "content", "status", "slug"),
    [
        ({"content-type": "text/csv"}, b"", 415, "unsupported-media"),
        ({**LINES, "content-encoding": "br"}, b"", 415, "unsupported-media"),
        ({**LINES, "content-encoding": "gzip"}, b"{}", 400, "malformed-body"),
        ({**LINES, "content-encoding": "gzip"}, gzip.compress(b"{}")[:-4], 400, "malformed-body"),
        ({**ARRAY, "content-encoding": "gzip"}, b"", 400, "malformed-body"),
    ],
)
def test_bodies_that_cannot_be_read(
    client: Client, headers: dict[str, str], content: bytes, status: int, slug: str
) -> None:
    problem(client.post(BULK, content=content, headers=headers), status, slug)


@pytest.mark.parametrize("query", ["detail=long", "detial=full", "detail=full&detail=x"])
def test_unknown_parameters_are_refused(client: Client, query: str) -> None:
    found = problem(client.post(f"{BULK}?{query}", content=b"", headers=LINES), 422, "invalid-request")
    assert found["errors"][0]["field"] in query


def test_a_request_on_which_the_service_fails_stands_alone(
    client: Client, monkeypatch: pytest.MonkeyPatch
) -> None:
    """One failing request takes neither the others nor the stream with it."""
    from service.bulk import summary

    real = summary.evaluate_batch

    def failing(requests: Any, rules: Any) -> Any:
        if any(r.label == "odd" for r in requests):
            raise ArithmeticError("made to fail")
        return real(requests, rules)

    monkeypatch.setattr(summary, "evaluate_batch", failing)
    sent = lines(GOOD, changed("label", "odd"), GOOD)
    found, closing = records(client.post(BULK, content=sent, headers=LINES))
    assert found[1]["problem"]["status"] == 500
    assert "made to fail" not in json.dumps(found)
    assert (closing.answered, closing.problems) == (2, 1)


def test_the_document_describes_it(client: Client) -> None:
    document = client.get("/api/v1/openapi.json").json()
    operation = document["paths"][BULK]["post"]
    assert set(operation["requestBody"]["content"]) == {"application/x-ndjson", "application/json"}
    assert operation["parameters"][0]["schema"] == {"enum": ["summary", "full"], "default": "summary"}
    assert {"Summary", "ProblemRecord", "Closing"} <= set(document["components"]["schemas"])
