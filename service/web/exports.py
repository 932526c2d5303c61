"""An evaluation to take along: the answer as JSON or CSV, from the address of the page."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response

from service.contract.answer import answer
from service.contract.evaluation import EvaluationResult
from service.contract.problem import UNITS
from service.web.csv_text import csv_text
from service.web.form import read_address

__all__ = ["answer_csv", "router"]

router = APIRouter(include_in_schema=False)


def _leaves(value: Any, path: str) -> Iterator[tuple[str, Any]]:
    """Every value of a document with its path, in order."""
    if isinstance(value, dict):
        for name, inner in value.items():
            yield from _leaves(inner, f"{path}.{name}" if path else name)
    elif isinstance(value, list):
        for number, inner in enumerate(value):
            yield from _leaves(inner, f"{path}.{number}")
    else:
        yield path, value


def answer_csv(result: EvaluationResult) -> str:
    """The whole answer as CSV: field, value, unit. Numbers as JSON gives them; blank = not applicable."""
    rows = []
    for path, value in _leaves(result.model_dump(mode="json"), ""):
        name = next((p for p in reversed(path.split(".")) if not p.isdecimal()), "")
        number = isinstance(value, int | float) and not isinstance(value, bool)
        unit = UNITS.get(name.rpartition("_")[2], "") if number else ""
        rows.append((path, str(value) if isinstance(value, bool) else value, unit))
    return csv_text(("field", "value", "unit"), rows)


def _download(name: str) -> dict[str, str]:
    return {"content-disposition": f'attachment; filename="{name}"', "cache-control": "no-store"}


@router.get("/evaluate.json")
async def as_json(request: Request) -> Response:
    """The JSON answer to the form of an address."""
    result = answer(read_address(request.url.query).request())
    text = result.model_dump_json(indent=2)
    return Response(text, media_type="application/json", headers=_download("evaluation.json"))


@router.get("/evaluate.csv")
async def as_csv(request: Request) -> Response:
    """Inputs and results of the form of an address as CSV."""
    text = answer_csv(answer(read_address(request.url.query).request()))
    return Response(text, media_type="text/csv; charset=utf-8", headers=_download("evaluation.csv"))
