"""Sweeps: the page, its table as CSV, and the API."""

from __future__ import annotations

from typing import Annotated
from urllib.parse import parse_qsl

from fastapi import APIRouter, Depends
from starlette.concurrency import run_in_threadpool
from starlette.requests import Request
from starlette.responses import RedirectResponse, Response

from service.contract.answer import cautions, rule_sets
from service.contract.classification import schemes
from service.contract.problem import FieldError, InvalidRequest
from service.contract.sweep import MAX_POINTS, SweepAnswer, SweepRequest, sweep
from service.web import csv_text
from service.web.asked import request_of
from service.web.body import read_model
from service.web.form import Form, address_items
from service.web.given import setup_given
from service.web.sweep_chart import LABELS, plots_of, unit_of
from service.web.sweep_form import choices, filled, query_of, split, sweep_of, value_as_set
from service.web.sweep_table import class_steps, listed, sweep_csv
from service.web.templates import page

__all__ = ["router"]

router = APIRouter()


async def read_sweep(request: Request) -> SweepRequest:
    """The sweep in the body. Raises a Problem that names what is wrong."""
    return await read_model(request, SweepRequest)


def _csv(answer: SweepAnswer) -> Response:
    headers = {"content-disposition": f'attachment; filename="sweep-{answer.sweep.field}.csv"'}
    return Response(sweep_csv(answer), media_type=csv_text.MEDIA, headers=headers)


@router.post(
    "/api/v1/sweep",
    response_model=SweepAnswer,
    tags=["evaluation"],
    summary="One laser over the values of one input",
    responses={200: {"content": {"text/csv": {}}}},
)
async def post_sweep(body: Annotated[SweepRequest, Depends(read_sweep)], request: Request) -> Response:
    """Hazard distance, ratio, density, governing limit and class at every value, from one computation.

    With `accept: text/csv` the same as a table.
    """
    answer = await run_in_threadpool(sweep, body)
    if "text/csv" in request.headers.get("accept", ""):
        return _csv(answer)
    return Response(answer.model_dump_json(), media_type="application/json")


def _read(request: Request) -> tuple[Form, dict[str, str]]:
    """The evaluation's form and the sweep's own fields. Raises BadAddress."""
    items = address_items(request.url.query)
    rest, own = split(items)
    return Form.read(rest), own


def _render(
    request: Request,
    form: Form,
    texts: dict[str, str],
    answer: SweepAnswer | None = None,
    errors: list[FieldError] | None = None,
) -> Response:
    laser = request_of(form)
    base = form.query()
    asked = None if answer is None else answer.sweep
    return page(
        request,
        "sweep.html",
        status=422 if errors else 200,
        form=form,
        texts=texts,
        base=parse_qsl(base, keep_blank_values=True),
        back=f"/evaluate?{base}",
        download=f"/sweep.csv?{query_of(base, texts)}",
        choices=[(c, query_of(base, {"field": c.field, "line": str(c.line + 1)})) for c in choices(laser)],
        answer=answer,
        plots=[] if answer is None or asked is None else plots_of(answer, value_as_set(laser, asked)),
        rows=[] if answer is None else listed(answer),
        steps=[]
        if answer is None
        else [(schemes()[k].scheme, class_steps(n)) for k, n in answer.hazard_class.items()],
        errors=errors or [],
        error_of={e.field.removeprefix("sweep."): e for e in errors or []},
        labels=LABELS,
        unit_of=unit_of,
        most=MAX_POINTS,
        cautions=cautions(),
        result=None,
        given=setup_given(form, {c.rules.id: c.rules.title for c in rule_sets().values()}),
    )


@router.get("/sweep", include_in_schema=False)
async def sweep_page(request: Request) -> Response:
    """The charts of a sweep. An address with blanks redirects to the one that says everything."""
    if not request.url.query:
        return page(request, "sweep_start.html", cautions=cautions(), result=None)
    form, own = _read(request)
    try:
        laser = request_of(form)
    except InvalidRequest:
        return RedirectResponse(f"/evaluate?{form.query()}", 303)
    texts = filled(own, laser)
    canonical = query_of(form.query(), texts)
    if canonical != request.url.query:
        return RedirectResponse(f"/sweep?{canonical}", 303)
    try:
        asked = SweepRequest(evaluation=laser, sweep=sweep_of(texts))
        answer = await run_in_threadpool(sweep, asked)
    except InvalidRequest as problem:
        return _render(request, form, texts, errors=problem.errors)
    return _render(request, form, texts, answer)


@router.get("/sweep.csv", include_in_schema=False)
async def sweep_table(request: Request) -> Response:
    """The same sweep as a table."""
    form, own = _read(request)
    try:
        laser = request_of(form)
    except InvalidRequest:
        return RedirectResponse(f"/evaluate?{form.query()}", 303)
    asked = SweepRequest(evaluation=laser, sweep=sweep_of(filled(own, laser)))
    return _csv(await run_in_threadpool(sweep, asked))
