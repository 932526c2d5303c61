"""The whole assessment as a PDF: from the address of an evaluation, and from the API."""

from __future__ import annotations

import json
import re
from collections.abc import Sequence
from dataclasses import replace
from datetime import UTC, date, datetime
from typing import Annotated, Any
from urllib.parse import quote

from fastapi import APIRouter, Depends
from starlette.concurrency import run_in_threadpool
from starlette.requests import Request
from starlette.responses import RedirectResponse, Response

from service import __version__
from service.contract.answer import answer, rule_sets
from service.contract.problem import FieldError, InvalidRequest
from service.contract.report import PAPERS, ReportRequest, day_of
from service.web.asked import request_of
from service.web.body import read_model
from service.web.chart import chart_of
from service.web.form import BadAddress, Form, address_items
from service.web.given import setup_given
from service.web.report_answer import answer_blocks, setup_blocks, verdict_blocks
from service.web.report_blocks import Block, printable
from service.web.report_working import working_blocks
from service.web.runs import spoken
from service.web.templates import environment
from service.web.typeset import MEDIA, pdf
from service.web.understood import understood

__all__ = ["own_parameters", "report_data", "report_file", "report_pdf", "router", "unknown_parameters"]

router = APIRouter()

TEMPLATE = "report/report.typ"
#: Parameters of the address beside those of the evaluation, in order.
OWN = ("paper", "date")
SLUG = re.compile(r"[^a-z0-9]+")
CODE_POINTS = re.compile(r"\[U\+[0-9A-F]{4,6}\]")
CODE_POINTS_NOTE = (
    "Characters that cannot be printed here stand as their code points, such as [U+1F600]; none was left out."
)
Parts = list[tuple[str, list[tuple[str, str]]]]


def _today() -> date:
    return datetime.now(UTC).date()


def _first_sentence(text: str) -> str:
    return text.partition(". ")[0].removesuffix(".") + "."


def _body(inputs: dict[str, Any]) -> str:
    """The request as JSON, one field a line."""
    fields = {name: value for name, value in inputs.items() if value is not None}
    rows = [f"{json.dumps(n)}: {json.dumps(v, ensure_ascii=False)}" for n, v in fields.items()]
    return "{\n" + ",\n".join(rows) + "\n}"


def report_data(
    request: ReportRequest, day: date, given: Parts | None = None, facts: Sequence[tuple[str, str]] = ()
) -> dict[str, Any]:
    """Everything the template needs, as JSON. Raises InvalidRequest.

    Parameters
    ----------
    request : laser, paper, place and who asks
    day : day of the report
    given : the setup as it was typed, part by part, where a form was filled
    facts : names and values of what else is known of this laser
    """
    result = answer(request.evaluation)
    chart = chart_of(result)
    plot = replace(chart.plot, description=spoken(chart.plot.description))
    svg = environment().get_template("chart.svg").render(plot=plot)
    titles = {c.rules.id: c.rules.title for c in rule_sets().values()}
    setup = setup_blocks(understood(result.inputs, titles), "Inputs as understood")
    if given:
        setup = [*setup_blocks(given, "The setup as given"), *setup]
    first: list[Block] = [
        *verdict_blocks(result, chart),
        *setup,
        *answer_blocks(result, replace(chart, plot=plot), svg),
    ]
    label = request.evaluation.label or "Laser, not named"
    told = [*facts, ("Place", request.place), ("Asked by", request.asked_by)]
    told += [
        ("Rule set", result.rules.title),
        ("Date", day.isoformat()),
        ("Made by", f"Blinkline {__version__}"),
    ]
    data: dict[str, Any] = {
        "paper": request.paper,
        "title": printable(label),
        "facts": [[name, printable(value)] for name, value in told if value],
        "cautions": [_first_sentence(text) for text in result.cautions],
        "digest": result.provenance.request_digest,
        "parts": [[*first, {"kind": "signature"}], working_blocks(result, printable(_body(result.inputs)))],
    }
    if CODE_POINTS.search(json.dumps([data["title"], data["facts"], setup], ensure_ascii=False)):
        data["parts"][0].insert(0, {"kind": "paragraph", "text": [[CODE_POINTS_NOTE, ""]], "small": False})
    return data


def report_pdf(
    request: ReportRequest, day: date, given: Parts | None = None, facts: Sequence[tuple[str, str]] = ()
) -> bytes:
    """The report. Takes a good part of a second: call it off the event loop. Raises InvalidRequest."""
    return pdf(TEMPLATE, report_data(request, day, given, facts), day)


async def report_file(
    request: ReportRequest, day: date, given: Parts | None = None, facts: Sequence[tuple[str, str]] = ()
) -> Response:
    """The report as a file, made off the event loop. Raises InvalidRequest."""
    slug = SLUG.sub("-", request.evaluation.label.lower())[:60].strip("-")
    name = f"laser-evaluation{f'-{slug}' if slug else ''}.pdf"
    body = await run_in_threadpool(report_pdf, request, day, given, facts)
    headers = {"content-disposition": f'inline; filename="{name}"', "cache-control": "no-store"}
    return Response(body, media_type=MEDIA["pdf"], headers=headers)


async def read_report(request: Request) -> ReportRequest:
    """The request in the body. Raises a Problem that names what is wrong."""
    return await read_model(request, ReportRequest)


@router.post(
    "/api/v1/report",
    tags=["evaluation"],
    summary="One laser as a report on paper",
    response_class=Response,
    responses={200: {"content": {"application/pdf": {}}, "description": "The report (PDF/UA-1)"}},
)
async def post_report(body: Annotated[ReportRequest, Depends(read_report)]) -> Response:
    """Inputs, results, chart, working, sources as tagged PDF; the same bytes for the same request and day."""
    day = _today() if body.date is None else day_of(body.date)
    return await report_file(body, day)


def own_parameters(items: list[tuple[str, str]]) -> tuple[list[tuple[str, str]], dict[str, str]]:
    """Other parameters, and those of the report, filled in. Raises BadAddress."""
    own: dict[str, str] = {}
    for name, value in items:
        if name in OWN:
            if name in own:
                raise _bad(name, value, "one value", "this parameter stands twice")
            own[name] = value
    own = {"paper": PAPERS[0], "date": _today().isoformat(), **own}
    if own["paper"] not in PAPERS:
        raise _bad("paper", own["paper"], ", ".join(PAPERS), "unknown paper")
    try:
        day_of(own["date"])
    except ValueError as error:
        raise _bad("date", own["date"], "a day such as 2026-12-01", str(error)) from None
    return [(n, v) for n, v in items if n not in OWN], own


def unknown_parameters(items: list[tuple[str, str]]) -> BadAddress:
    """The problem of an address with parameters that a report does not take."""
    name, value = items[0]
    return _bad(name[:100], value, ", ".join(OWN), "unknown parameter")


def _bad(name: str, value: str, allowed: str, message: str) -> BadAddress:
    remedy = "Correct it in the address, or leave it out."
    error = FieldError(field=name, value=value[:100], allowed=allowed, message=message, remedy=remedy)
    return BadAddress(f"{name}: {message}", [error])


@router.get("/report", include_in_schema=False)
async def report_page(request: Request) -> Response:
    """The report of the evaluation at this address; one address holds the day and the paper too."""
    items = address_items(request.url.query)
    rest, own = own_parameters(items)
    if not rest:
        return RedirectResponse("/", 303)
    form = Form.read(rest)
    canonical = "&".join([form.query(), *(f"{name}={quote(own[name])}" for name in OWN)])
    if canonical != request.url.query:
        return RedirectResponse(f"/report?{canonical}", 303)
    try:
        laser = request_of(form)
        rules = {c.rules.id: c.rules.title for c in rule_sets().values()}
        asked = ReportRequest.model_validate({"evaluation": laser, **own})
        given = setup_given(form, rules)
        return await report_file(asked, day_of(own["date"]), given)
    except InvalidRequest:
        return RedirectResponse(f"/evaluate?{form.query()}", 303)
