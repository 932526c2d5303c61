"""Streams of records: many requests in, one JSON record each out, in order, a closing record last."""

from __future__ import annotations

import logging
from collections.abc import Callable, Iterator, Sequence
from itertools import islice
from typing import Any, Literal

from pydantic_core import to_json

from service.bulk.summary import Closing, ProblemRecord, summaries
from service.contract.answer import answer, cautions, rule_set
from service.contract.problem import BodyTooLarge, Problem
from service.contract.reading import read_json, request_of
from service.contract.request import EvaluationRequest
from service.contract.result import RulesInfo

__all__ = ["CHUNK", "DETAILS", "LINE_LIMIT", "Detail", "Failure", "Records", "body_lines"]

Detail = Literal["summary", "full"]
DETAILS: tuple[Detail, ...] = ("summary", "full")
#: Requests evaluated in one pass; whole answers are large, so fewer are held at a time.
CHUNK: dict[Detail, int] = {"summary": 1000, "full": 20}
#: Largest request in a stream [bytes].
LINE_LIMIT = 1_000_000
LOG = logging.getLogger("blinkline")


class Failure(Problem):
    """The service failed on one request; the others are answered."""

    slug = "http"
    title = "The request cannot be answered"
    status = 500


def body_lines(body: bytes | bytearray) -> Iterator[bytes]:
    """The lines of an NDJSON body that are not blank."""
    start = 0
    while start < len(body):
        end = body.find(b"\n", start)
        end = len(body) if end < 0 else end
        line = bytes(body[start:end]).strip()
        start = end + 1
        if line:
            yield line


class Records:
    """Records of a stream of requests: iterate over `chunks`, then read the counts.

    Parameters
    ----------
    items : what was sent, one by one: a line of NDJSON as bytes, JSON data, or a Problem for what cannot be
        used. A Problem that is raised ends the stream and is told in the closing record.
    detail : `summary` or `full`
    rules_id : rule set of requests that name none; None leaves that to the request's default
    """

    def __init__(self, items: Iterator[Any], detail: Detail, rules_id: str | None = None) -> None:
        self.items, self.detail, self._rules_id = items, detail, rules_id
        self.answered = self.problems = 0
        self.stopped: str | None = None
        self.rules: dict[str, RulesInfo] = {}
        self._next = 0

    def go_on(self, answered: int, problems: int, rules: Sequence[str]) -> None:
        """Count on from records that were made before, by the rule sets named."""
        self.answered, self.problems, self._next = answered, problems, answered + problems
        self.rules = {rules_id: _info(rules_id) for rules_id in rules}

    def chunks(self) -> Iterator[list[bytes]]:
        """Records without line ends, a list per pass; the closing record is not among them."""
        render = _whole if self.detail == "full" else _short
        while self.stopped is None:
            taken: list[EvaluationRequest | Problem] = []
            try:
                for item in islice(self.items, CHUNK[self.detail]):
                    taken.append(self._request(item))
            except Problem as problem:
                self.stopped = problem.detail
            if not taken:
                return
            yield self._render(taken, render)

    def lines(self) -> Iterator[bytes]:
        """The whole answer as NDJSON, one piece per pass."""
        for chunk in self.chunks():
            yield b"\n".join(chunk) + b"\n"
        yield self.last_line()

    def last_line(self) -> bytes:
        """The line with the closing record."""
        return to_json({"closing": self.closing().model_dump()}) + b"\n"

    def closing(self) -> Closing:
        """The closing record."""
        return Closing(
            lasers=self.answered + self.problems,
            answered=self.answered,
            problems=self.problems,
            complete=self.stopped is None,
            stopped=self.stopped,
            rules=list(self.rules.values()),
            cautions=cautions(),
        )

    def _request(self, item: Any) -> EvaluationRequest | Problem:
        """The request of an item, or why it cannot be used."""
        if isinstance(item, Problem):
            return item
        try:
            if isinstance(item, bytes):
                if len(item) > LINE_LIMIT:
                    raise BodyTooLarge(f"the request is larger than {LINE_LIMIT} bytes")
                item = read_json(item)
            if self._rules_id is not None and isinstance(item, dict):
                item = {"rules": self._rules_id, **item}
            request = request_of(item)
            if request.rules not in self.rules:
                self.rules[request.rules] = _info(request.rules)
            return request
        except Problem as problem:
            return problem

    def _render(self, taken: Sequence[EvaluationRequest | Problem], render: Render) -> list[bytes]:
        """The records of one pass. Where a pass fails, each request is tried alone."""
        index = range(self._next, self._next + len(taken))
        self._next += len(taken)
        good = [(k, r) for k, r in zip(index, taken, strict=True) if not isinstance(r, Problem)]
        found = {k: _problem(k, r) for k, r in zip(index, taken, strict=True) if isinstance(r, Problem)}
        try:
            found.update(render(good))
        except Exception:
            LOG.exception("a pass failed; its requests are tried one by one")
            for pair in good:
                try:
                    found.update(render([pair]))
                except Exception:
                    failure = Failure("The service failed on this request. Nothing was computed for it.")
                    found[pair[0]] = _problem(pair[0], failure)
        records = [found[k] for k in index]
        problems = sum(record.startswith(PROBLEM, record.find(b",")) for record in records)
        self.problems += problems
        self.answered += len(records) - problems
        return records


Render = Callable[[Sequence[tuple[int, EvaluationRequest]]], dict[int, bytes]]
#: How a problem goes on after its index.
PROBLEM = b',"problem":'


def _short(good: Sequence[tuple[int, EvaluationRequest]]) -> dict[int, bytes]:
    if not good:
        return {}
    found = summaries([r for _, r in good], [k for k, _ in good])
    return {record["index"]: to_json(record) for record in found}


def _whole(good: Sequence[tuple[int, EvaluationRequest]]) -> dict[int, bytes]:
    return {k: b'{"index":%d,' % k + answer(r).model_dump_json().encode()[1:] for k, r in good}


def _problem(index: int, problem: Problem) -> bytes:
    return ProblemRecord(index=index, problem=problem.document()).model_dump_json().encode()


def _info(rules_id: str) -> RulesInfo:
    return RulesInfo.of(rule_set(rules_id).rules)
