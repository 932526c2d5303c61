"""Signs: as JSON, PDF, SVG and PNG from the API, and the page with the form beside its preview."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import UTC, date, datetime
from typing import Annotated, Any
from urllib.parse import parse_qsl

from anyio.to_thread import run_sync
from fastapi import APIRouter, Depends
from starlette.requests import Request
from starlette.responses import RedirectResponse, Response

from service.contract.answer import answer
from service.contract.evaluation import EvaluationResult
from service.contract.problem import FieldError, InvalidRequest, NotFound
from service.contract.request import EvaluationRequest
from service.contract.result import Model
from service.sign.content import SignContent, SiteDefaults, sign_content
from service.sign.request import SignOptions, SignRequest
from service.sign.tables import sign_tables
from service.web.body import read_model
from service.web.form import Form, address_items
from service.web.peers import over_tls
from service.web.problems import PlainProblem
from service.web.sign_form import LABELS, SignForm, as_form_errors, choices, split
from service.web.sign_sheet import SetSign, sign_on_sheet
from service.web.templates import page
from service.web.typeset import MEDIA

__all__ = ["FORMATS", "SignAnswer", "base_address", "make_sign", "router", "sign_answer"]

router = APIRouter()
#: Media types that a client may ask for, by what they make.
FORMATS = {"application/json": "json", **{media: form for form, media in MEDIA.items()}}
WILD = {"*/*": "pdf", "application/*": "pdf", "image/*": "svg"}


class Facts(Model):
    """Sizes as set: heights of capitals, side of the symbol, and how far each reaches."""

    headline_mm: float
    details_mm: float
    symbol_side_mm: float | None
    symbol_m: float | None
    letters_m: float


class SignAnswer(Model):
    """What a sign says, how large it is set, and the request it came from."""

    content: SignContent
    facts: Facts
    provenance: dict[str, Any]


async def read_sign_request(request: Request) -> SignRequest:
    """The sign request in the body. Raises a Problem that names what is wrong."""
    return await read_model(request, SignRequest)


def _format(request: Request, asked: Sequence[tuple[str, str]]) -> str:
    """pdf, svg, png or json: by the parameter `format`, otherwise by `Accept`."""
    allowed = ", ".join(sorted(FORMATS.values()))
    for name, value in asked:
        if name == "format" and value in FORMATS.values():
            return value
        error = FieldError(
            field=name[:100],
            value=value[:100],
            allowed=allowed if name == "format" else "no such parameter",
            message="unknown format" if name == "format" else "unknown parameter",
            remedy="Choose one of the formats listed." if name == "format" else "Leave it out.",
        )
        raise InvalidRequest(f"{name[:100]}: {error.message}", [error])
    accepted = [a.partition(";")[0].strip().lower() for a in request.headers.get("accept", "*/*").split(",")]
    for media in accepted:
        found = {**FORMATS, **WILD}.get(media)
        if found:
            return found
    raise PlainProblem(406, f"a sign is made as {', '.join(FORMATS)}; ask for one of these")


def _site(request: Request) -> SiteDefaults:
    settings = request.app.state.settings
    return SiteDefaults(settings.sign_policy, settings.lso_name, settings.lso_phone)


def make_sign(
    evaluation: EvaluationRequest, options: SignOptions, site: SiteDefaults, today: date
) -> tuple[EvaluationResult, SetSign]:
    """The answer to an evaluation and its sign. Raises InvalidRequest where a rule refuses it."""
    result = answer(evaluation)
    return result, sign_on_sheet(sign_content(result, options, site, today), options)


def _today() -> date:
    return datetime.now(UTC).date()


async def sign_answer(
    request: Request,
    asked: Sequence[tuple[str, str]],
    evaluation: EvaluationRequest,
    options: SignOptions,
) -> Response:
    """The sign in the form that the client asks for; `asked` are parameters: `format` or none."""
    form = _format(request, asked)
    result, sign = make_sign(evaluation, options, _site(request), _today())
    if form == "json":
        facts = Facts(**await run_sync(sign.facts))
        provenance = result.provenance.model_dump()
        made = SignAnswer(content=sign.content, facts=facts, provenance=provenance)
        return Response(made.model_dump_json(), media_type="application/json")
    return await _file(sign, form)


async def _file(sign: SetSign, form: str) -> Response:
    body = await run_sync(
        sign.pdf if form == "pdf" else lambda: sign.picture("svg" if form == "svg" else "png")
    )
    headers = {"content-disposition": f'inline; filename="sign.{form}"', "cache-control": "no-store"}
    return Response(body, media_type=MEDIA[form], headers=headers)


@router.post(
    "/api/v1/sign",
    tags=["signs"],
    summary="A sign or label for one laser",
    response_model=SignAnswer,
    responses={200: {"content": {media: {"schema": {"type": "string"}} for media in MEDIA.values()}}},
)
async def post_sign(request: Request, body: Annotated[SignRequest, Depends(read_sign_request)]) -> Response:
    """PDF, SVG or PNG, or what the sign says as JSON: by `Accept` or `?format=pdf|svg|png|json`."""
    asked = request.query_params.multi_items()
    return await sign_answer(request, asked, body.evaluation, body.sign)


def _forms(request: Request) -> tuple[Form, SignForm]:
    """The forms of evaluation and sign in an address. Raises BadAddress."""
    items = address_items(request.url.query)
    own, sign = split(items)
    if not own:
        raise NotFound("a sign is made from an evaluation: start from its page")
    return Form.read(own), SignForm.read(sign)


def base_address(request: Request) -> str:
    """The address of this service as people reach it, without a last slash."""
    settings, seen = request.app.state.settings, request.base_url
    if over_tls(request, settings):
        seen = seen.replace(scheme="https")
    return settings.public_address or str(seen).rstrip("/")


def _made(request: Request, form: Form, sign_form: SignForm) -> SetSign:
    """The sign of an address. Raises InvalidRequest with the names of the forms' fields."""
    try:
        evaluation = form.request()
    except InvalidRequest:
        problem = "the evaluation has values that cannot be used; mend them on its page"
        raise InvalidRequest(problem, [_no_evaluation(problem)]) from None
    options = sign_form.options(f"{base_address(request)}/evaluate?{form.query()}")
    try:
        return make_sign(evaluation, options, _site(request), _today())[1]
    except InvalidRequest as error:
        raise as_form_errors(error) from None


def _no_evaluation(message: str) -> FieldError:
    return FieldError(
        field="evaluation",
        value=None,
        allowed="an evaluation",
        message=message,
        remedy="Go back to the evaluation.",
    )


@router.get("/sign", include_in_schema=False)
async def sign_page(request: Request) -> Response:
    """The form of the sign beside its preview. Every sheet has one address; others redirect to it."""
    form, sign_form = _forms(request)
    sign_form = sign_form.with_date(_today().isoformat())
    query = f"{form.query()}&{sign_form.query()}"
    if query != request.url.query:
        return RedirectResponse(f"/sign?{query}", 303)
    sign, facts, errors = None, None, []
    try:
        sign = _made(request, form, sign_form)
        facts = await run_sync(sign.facts)
    except InvalidRequest as problem:
        sign, errors = None, as_form_errors(problem).errors
    return page(
        request,
        "sign.html",
        status=422 if errors else 200,
        form=sign_form,
        label=form.get("label"),
        evaluation=parse_qsl(form.query()),
        evaluation_query=form.query(),
        query=query,
        sign=sign,
        facts=facts,
        errors=errors,
        error_of={e.field: e for e in reversed(errors)},
        choices=choices(),
        labels=LABELS,
        sizes=sign_tables().sheets.labels.sizes,
        settings=request.app.state.settings,
    )


@router.get("/sign/print", include_in_schema=False)
async def print_page(request: Request) -> Response:
    """The sheet alone, in its true size, to be printed by the browser."""
    form, sign_form = _forms(request)
    sign = _made(request, form, sign_form)
    await run_sync(sign.facts)
    query = f"{form.query()}&{sign_form.query()}"
    sheet = f"{sign_form.get('sheet')}-{sign_form.get('orientation')}"
    return page(request, "sign_print.html", sign=sign, query=query, sheet=sheet)


@router.get("/sign/sheet.{form_name}", include_in_schema=False)
async def sheet_file(request: Request, form_name: str) -> Response:
    """The sheet of an address as a file."""
    if form_name not in MEDIA:
        raise NotFound(f"a sheet is made as {', '.join(MEDIA)}")
    form, sign_form = _forms(request)
    return await _file(_made(request, form, sign_form), form_name)
