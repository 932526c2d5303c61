"""The evaluation page: one form, the answer on the same page, a shareable address."""

from __future__ import annotations

import json
from datetime import UTC, datetime
from functools import cache
from typing import Any

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import RedirectResponse, Response

from service.contract.answer import answer, cautions, rule_sets
from service.contract.evaluation import EvaluationResult
from service.contract.problem import FieldError, InvalidRequest, NotFound
from service.files import DATA
from service.register.problems import TEXTS as REGISTER_PROBLEMS
from service.rules.materials import materials
from service.rules.tables import read_toml
from service.web import present
from service.web.asked import MISSING, field_of, third
from service.web.fields import ADDRESS_VERSION, ELEMENTS, FIELDS, PARTS, label_of
from service.web.form import Form, read_address
from service.web.given import setup_given
from service.web.looks import looks, words_for
from service.web.packed import packed
from service.web.shelf import shelf
from service.web.sidebyside import side_by_side
from service.web.templates import environment, page
from service.web.units import FAMILIES

__all__ = ["router"]

router = APIRouter(include_in_schema=False)

#: Heading of the page before there is an answer.
TITLE = "Evaluate a laser before it is switched on"
PROBLEMS = {
    "invalid-request": "A field is missing, unknown or outside its range. The errors name each field, "
    "the value received, what is allowed and what to do.",
    "malformed-body": "The body is not a JSON document: the detail says where reading stopped.",
    "body-too-large": "The body is larger than this service reads.",
    "unsupported-media": "The body is not declared as JSON. Send the header content-type: application/json.",
    "not-found": "There is nothing at this address.",
    "bad-address": "The address of a page has a parameter that the form does not know, or comes from "
    "an older form. Nothing is filled in silently, because a changed value could hide a hazard.",
    "unknown-host": "The request names a host that the operator of this service has not listed.",
    "too-many-requests": "Your address asks more often than the operator allows. The header retry-after "
    "says in how many seconds to ask again.",
    "overloaded": "More requests are being computed than the operator allows, so this one was refused "
    "before anything was computed. The header retry-after says when to ask again.",
    "body-too-slow": "The body of the request did not arrive in the time that the operator allows.",
    **REGISTER_PROBLEMS,
    "http": "The request cannot be answered; the status and the detail say why.",
}


@cache
def _examples() -> list[dict[str, str]]:
    """Name, address and a word about every starting example."""
    entries = read_toml(DATA / "demo" / "examples.toml")["example"]
    return [
        {"name": e["name"], "about": e["about"], "address": f"/evaluate?{_example(e).query()}"}
        for e in entries
    ]


def _example(entry: dict[str, Any]) -> Form:
    values = dict(entry["values"])
    counts = {part: int(values.pop(part, spec.least)) for part, spec in PARTS.items()}
    return Form(values, counts)


@cache
def _fixed() -> dict[str, Any]:
    """What templates of the form need whatever stands in it."""
    sets = [c.rules for c in rule_sets().values()]
    return {
        "fields": FIELDS,
        "families": FAMILIES,
        "parts": PARTS,
        "elements": ELEMENTS,
        "materials": [(name, name) for name in materials(DATA)],
        "rule_choices": [(r.id, f"{r.title} ({r.standing})") for r in sets],
        "blank_title": TITLE,
        "looks": looks(),
        "cautions": cautions(),
        "examples": _examples(),
        "address_version": ADDRESS_VERSION,
        "shelf": shelf(),
        "label_of": label_of,
        "third": third,
        "field_of": field_of,
    }


def _of_result(form: Form, sides: list[EvaluationResult], result: EvaluationResult) -> dict[str, Any]:
    """What templates of the answer need."""
    titles = {c.rules.id: c.rules.title for c in rule_sets().values()}
    body = {k: v for k, v in result.inputs.items() if v is not None}
    return {
        "result": result,
        "words": words_for(result),
        "side": side_by_side(sides),
        "given": setup_given(form, titles),
        "today": datetime.now(UTC).date().isoformat(),
        "body": json.dumps(body, indent=2),
    }


def _answered(form: Form, *, quick: bool = False) -> dict[str, Any]:
    """Values for a page with an answer. Raises InvalidRequest.

    A lit spot or a sweep takes many evaluations; `quick` then leaves the other rule sets out.
    """
    request = form.request()
    result = answer(request)
    others = [k for k in rule_sets() if k != request.rules]
    if quick and (result.diffuse or result.scan):
        others = []
    sides = [result, *(answer(request.model_copy(update={"rules": key})) for key in others)]
    return _of_result(form, sides, result)


def _with_errors(errors: list[FieldError]) -> dict[str, Any]:
    return {"result": None, "errors": errors, "error_of": {e.field: e for e in reversed(errors)}}


@router.get("/")
async def blank(request: Request) -> Response:
    """The blank form."""
    if request.url.query:
        raise NotFound("the first page takes no parameters; evaluations live under /evaluate")
    return page(request, "evaluate.html", form=Form(), live=False, **_fixed(), **_with_errors([]))


@router.get("/evaluate")
def evaluate_page(request: Request) -> Response:
    """The form with its answer. A form not in canonical order redirects to its one address."""
    if not request.url.query:
        return RedirectResponse("/", 303)
    form = read_address(request.url.query)
    canonical = form.query()
    if canonical != request.url.query:
        place = f"#{form.anchor}" if form.anchor else ""
        return RedirectResponse(f"/evaluate?{canonical}{place}", 303)
    status, values = 200, _with_errors([])
    if not form.edit:
        try:
            values |= _answered(form)
        except InvalidRequest as problem:
            status, values = 422, _with_errors(problem.errors)
    return page(request, "evaluate.html", status=status, form=form, live=False, **_fixed(), **values)


@router.get("/live")
def live(request: Request) -> Response:
    """The answer alone, for a page that refreshes while somebody types.

    JSON with the one `address` of the form, the `title` of the page and its heading (`named`), the
    `answer` as markup, the same in a sentence (`said`), what was understood of each field (`echo`) and what
    is wrong with it (`error`).
    """
    typed = read_address(request.url.query)
    form = typed.canonical()
    try:
        values = _with_errors([]) | _answered(form, quick=True)
    except InvalidRequest as problem:
        values = _with_errors(problem.errors)
        # A form that is only not yet filled is no mistake: its address shows it for editing.
        form.edit = all(e.message == MISSING for e in problem.errors)
    result, errors = values["result"], values["errors"]
    template = environment().get_template("live.html")
    html = template.render(form=form, path="/evaluate", live=True, **_fixed(), **values)
    named = (form.get("label") or "Evaluation") if result else TITLE
    if result:
        said = present.spoken(result, values["words"])
    elif form.edit:
        said = f"Not yet complete: {len(errors)} still needed."
    else:
        said = f"Nothing was computed: {len(errors)} to check."
    echoes = {f"{name}-echo": typed.echo(name) for name in form.numbers()}
    document = {
        "address": f"/evaluate?{form.query()}",
        "title": f"{named} · Blinkline",
        "named": named,
        "answered": result is not None,
        "answer": html,
        "said": said,
        "echo": echoes | {f"third-{k}": third(form, k) for k in range(1, form.lines + 1)},
        "error": {e.field: f"{e.message}. {e.remedy}" for e in errors if e.message != MISSING},
    }
    content, how = packed(request, json.dumps(document).encode())
    headers = {"cache-control": "no-store", **how}
    return Response(content, media_type="application/json", headers=headers)


@router.get("/problems/{slug}")
async def problem_type(request: Request, slug: str) -> Response:
    """What a type of problem means."""
    if slug not in PROBLEMS:
        raise NotFound(f"there is no problem type {slug[:100]!r}")
    return page(request, "problem_type.html", slug=slug, text=PROBLEMS[slug])
