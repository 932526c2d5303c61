"""The evaluation page: one form, the answer on the same page, a shareable address."""

from __future__ import annotations

import json
from datetime import UTC, datetime
from functools import cache
from typing import Any
from urllib.parse import parse_qsl

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import RedirectResponse, Response

from service.contract.answer import answer, cautions, rule_sets
from service.contract.evaluation import EvaluationResult
from service.contract.problem import FieldError, InvalidRequest, NotFound
from service.files import DATA
from service.register.problems import TEXTS as REGISTER_PROBLEMS
from service.rules.tables import read_toml
from service.web.fields import ADDRESS_VERSION, label_of
from service.web.form import BadAddress, Form
from service.web.given import setup_given
from service.web.shelf import shelf
from service.web.templates import page

__all__ = ["router"]

router = APIRouter(include_in_schema=False)

#: More than a form with every line can send.
MAX_PARAMETERS = 400
PROBLEMS = {
    "invalid-request": "A field is missing, unknown or outside its range. The errors name each field, "
    "the value received, what is allowed and what to do.",
    "malformed-body": "The body is not a JSON document: the detail says where reading stopped.",
    "body-too-large": "The body is larger than this service reads.",
    "unsupported-media": "The body is not declared as JSON. Send the header content-type: application/json.",
    "not-found": "There is nothing at this address.",
    "bad-address": "The address of a page has a parameter that the form does not know, or comes from "
    "an older form. Nothing is filled in silently, because a changed value could hide a hazard.",
    **REGISTER_PROBLEMS,
    "http": "The request cannot be answered; the status and the detail say why.",
}


@cache
def _examples() -> list[tuple[str, str]]:
    """Name and address of every starting example."""
    entries = read_toml(DATA / "demo" / "examples.toml")["example"]
    return [(e["name"], f"/evaluate?{Form(dict(e['values'])).query()}") for e in entries]


def _render(
    request: Request,
    form: Form,
    result: EvaluationResult | None = None,
    errors: list[FieldError] | None = None,
    status: int = 200,
) -> Response:
    body: dict[str, Any] | None = None
    if result is not None:
        body = {k: v for k, v in result.inputs.items() if v is not None}
    choices = {
        (d.duration_s, d.words): None
        for compiled in rule_sets().values()
        for d in compiled.rules.durations
        if d.kind == "choice"
    }
    titles = {c.rules.id: c.rules.title for c in rule_sets().values()}
    return page(
        request,
        "evaluate.html",
        status=status,
        form=form,
        result=result,
        errors=errors or [],
        error_of={e.field: e for e in reversed(errors or [])},
        rule_sets=[c.rules for c in rule_sets().values()],
        durations=list(choices),
        cautions=cautions(),
        examples=_examples(),
        address_version=ADDRESS_VERSION,
        shelf=shelf(),
        label_of=label_of,
        given=setup_given(form, titles) if result else [],
        today=datetime.now(UTC).date().isoformat(),
        body=json.dumps(body, indent=2) if body else "",
    )


@router.get("/")
async def blank(request: Request) -> Response:
    """The blank form."""
    if request.url.query:
        raise NotFound("the first page takes no parameters; evaluations live under /evaluate")
    return _render(request, Form())


@router.get("/evaluate")
async def evaluate_page(request: Request) -> Response:
    """The form with its answer. A form not in canonical order redirects to its one address."""
    try:
        items = parse_qsl(request.url.query, keep_blank_values=True, max_num_fields=MAX_PARAMETERS)
    except ValueError:
        raise BadAddress(f"the address has more than {MAX_PARAMETERS} parameters") from None
    if not items:
        return RedirectResponse("/", 303)
    form = Form.read(items)
    canonical = form.query()
    if canonical != request.url.query:
        return RedirectResponse(f"/evaluate?{canonical}", 303)
    if form.edit:
        return _render(request, form)
    try:
        return _render(request, form, answer(form.request()))
    except InvalidRequest as problem:
        return _render(request, form, errors=problem.errors, status=422)


@router.get("/problems/{slug}")
async def problem_type(request: Request, slug: str) -> Response:
    """What a type of problem means."""
    if slug not in PROBLEMS:
        raise NotFound(f"there is no problem type {slug[:100]!r}")
    return page(request, "problem_type.html", slug=slug, text=PROBLEMS[slug])
