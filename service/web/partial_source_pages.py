"""Structured sources as a page: emitters typed in, or an image of the source."""

from __future__ import annotations

import re
from typing import Any

from fastapi import APIRouter
from starlette.concurrency import run_in_threadpool
from starlette.requests import Request
from starlette.responses import Response

from service.contract.answer import cautions
from service.contract.partial_source import PartialSourceRequest, PartialSourceResult
from service.contract.partial_source_answer import partial_source, source_image
from service.contract.problem import FieldError, InvalidRequest
from service.web.entries import Entry, Group, Sheet, in_words
from service.web.form import Form
from service.web.graph import Chart, chart
from service.web.heat import Heat, heat
from service.web.links import address_of
from service.web.numbers import NotANumber, parse_number
from service.web.profile_pages import form_parts, image_body, laser_of
from service.web.templates import page

__all__ = ["router"]

router = APIRouter(include_in_schema=False)

#: A laser to start from where none travels along: an invented row of diodes.
EXAMPLE = (
    "v=1&label=Row%20of%20diodes&rules=icnirp-2013&exposure_s=10&lines=1&wavelength_nm-1=850&mode-1=cw"
    "&power_w-1=0.05&diameter_mm-1=5&divergence_mrad-1=200"
)
GROUPS = (
    Group(
        "Seen from",
        (Entry("distance_m", "Distance", "m", "Blank: 0.1 m, the nearest an eye focuses."),),
    ),
    Group(
        "Emitters",
        (
            Entry(
                "emitters",
                "x, y and diameter [mm], one emitter a line",
                help="0 0 0.1, or width and height 0 0 0.1 0.3 for a rectangle; x 3 behind it for three "
                "times the power. A row: 0 0 0.1 repeat 10 0.5 0 (ten times, 0.5 mm apart along x).",
                rows=8,
            ),
        ),
    ),
    Group(
        "or an image of the source",
        (
            Entry("pixel_um", "Pixel size", "µm", "In the source."),
            Entry("background", "Background", "counts", "Blank: from the corners."),
        ),
    ),
)
ROW = re.compile(
    r"(?P<numbers>.+?)(?:\s+x\s+(?P<power>\S+))?"
    r"(?:\s+repeat\s+(?P<times>\d{1,4})\s+(?P<dx>\S+)\s+(?P<dy>\S+))?"
)


def _emitters(text: str, errors: list[FieldError]) -> list[dict[str, Any]]:
    """Lines of the text as emitters; a line that cannot be read joins the errors."""
    found: list[dict[str, Any]] = []
    for number, line in enumerate((t.strip() for t in re.split(r"[\r\n;]+", text)), start=1):
        if not line:
            continue
        try:
            match = ROW.fullmatch(line)
            assert match is not None
            values = [parse_number(word) for word in match["numbers"].split()]
            if len(values) not in (3, 4):
                raise NotANumber(f"{len(values)} numbers stand here", "Write x, y and diameter.")
            one: dict[str, Any] = {"width_mm": values[2]}
            if len(values) == 4:
                one |= {"height_mm": values[3], "shape": "rectangle"}
            if match["power"]:
                one["power"] = parse_number(match["power"])
            times = int(match["times"] or 1)
            dx, dy = (parse_number(match[n] or "0") for n in ("dx", "dy"))
            found += [{"x_mm": values[0] + k * dx, "y_mm": values[1] + k * dy, **one} for k in range(times)]
        except NotANumber as error:
            errors.append(
                FieldError(
                    field="emitters",
                    value=line[:100],
                    allowed="x, y and diameter in mm on each line",
                    message=f"line {number}: {error}",
                    remedy=error.remedy,
                )
            )
    return found


def _request(
    sheet: Sheet, laser: Form, name: str, content: bytes, errors: list[FieldError]
) -> PartialSourceRequest:
    body = sheet.body(errors)
    if "emitters" in body:
        body["emitters"] = _emitters(body["emitters"], errors)
    if name or content:
        body |= image_body(name, content)
    body["evaluation"] = laser.request().model_dump(mode="json", exclude_unset=True)
    try:
        return sheet.validated(PartialSourceRequest, body, errors)
    except InvalidRequest as problem:
        listed = [
            e.model_copy(update={"field": "emitters"}) if e.field.startswith("emitters.") else e
            for e in problem.errors
        ]
        raise InvalidRequest(problem.detail, listed) from None


def _judge(request: PartialSourceRequest) -> tuple[PartialSourceResult, Heat]:
    image, pixel = source_image(request)
    return partial_source(request), heat(image, (pixel[0] * 1e-3, pixel[1] * 1e-3))


def _chart(result: PartialSourceResult) -> Chart | None:
    """Ratio of every part over its subtense."""
    if len(result.parts) < 2:
        return None
    alpha = [p.alpha_mrad for p in result.parts]
    ratio = [p.hazard_ratio for p in result.parts]
    return chart("subtense of the part [mrad]", "", "exposure over limit", "", [("", alpha, ratio)])


def _page(request: Request, sheet: Sheet, laser: Form, errors: list[FieldError], **more: Any) -> Response:
    return page(
        request,
        "bounds/partial_source.html",
        status=422 if errors else 200,
        form=sheet,
        laser=laser,
        errors=errors,
        error_of={e.field: e for e in reversed(errors)},
        cautions=cautions(),
        **{"result": None, "heat": None, "chart": None, "address": "", **more},
    )


def _laser(text: str) -> Form:
    laser = laser_of(text or EXAMPLE)
    assert laser is not None
    return laser


@router.get("/partial-source")
async def partial_source_page(request: Request) -> Response:
    """The blank form, for the evaluation whose query is given or for an example."""
    return _page(request, Sheet(GROUPS), _laser(request.url.query), [])


@router.post("/partial-source")
async def partial_source_answer(request: Request) -> Response:
    """The form with its answer."""
    texts, name, content = await form_parts(request)
    laser = _laser(texts.pop("laser", ""))
    sheet = Sheet.read(GROUPS, texts.items())
    errors: list[FieldError] = []
    try:
        wanted = _request(sheet, laser, name, content, errors)
        result, drawn = await run_in_threadpool(_judge, wanted)
    except InvalidRequest as problem:
        return _page(request, sheet, laser, in_words(problem.errors))
    address = address_of(result.evaluation)
    return _page(request, sheet, laser, [], result=result, heat=drawn, chart=_chart(result), address=address)
