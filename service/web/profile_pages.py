"""A camera image of the beam as a page: the file is read, judged and forgotten."""

from __future__ import annotations

import base64
from typing import Any
from urllib.parse import parse_qsl

from fastapi import APIRouter
from starlette.concurrency import run_in_threadpool
from starlette.datastructures import UploadFile
from starlette.exceptions import HTTPException
from starlette.formparsers import MultiPartException
from starlette.requests import Request
from starlette.responses import Response

from service.contract.answer import cautions
from service.contract.problem import BodyTooLarge, FieldError, InvalidRequest, MalformedBody
from service.contract.profile import ProfileRequest, ProfileResult
from service.contract.profile_answer import Picture, picture, profile
from service.web.entries import MAX_PARAMETERS, Entry, Group, Sheet, in_words
from service.web.form import BadAddress, Form
from service.web.heat import Heat, heat
from service.web.numbers import NotANumber, parse_number
from service.web.templates import page

__all__ = ["form_parts", "router"]

router = APIRouter(include_in_schema=False)

ENDINGS = {"png": "png", "tif": "tiff", "tiff": "tiff", "csv": "csv", "txt": "csv"}
GROUPS = (
    Group(
        "Camera",
        (
            Entry("pixel_um", "Pixel size", "µm", "In the plane of the beam: with a lens, as imaged."),
            Entry("pixel_y_um", "Pixel height", "µm", "Blank: square pixels."),
            Entry("background", "Background", "counts", "Blank: from the corners."),
            Entry("distance_m", "Distance of the plane", "m", "From the exit or last element. Blank: there."),
            Entry(
                "apertures_mm", "Apertures", "mm", "Blank: 1, 3.5 and 7 mm. Parted by blanks.", number=False
            ),
        ),
    ),
)


async def form_parts(request: Request) -> tuple[dict[str, str], str, bytes]:
    """Texts of a sent form, name and content of its file. Raises a Problem."""
    limit = request.app.state.settings.image_limit
    if int(request.headers.get("content-length") or limit + 1) > limit:
        raise BodyTooLarge(f"the form is larger than {limit} bytes; send a smaller image")
    try:
        async with request.form(max_files=1, max_fields=30, max_part_size=limit) as form:
            texts = {name: value.strip() for name, value in form.multi_items() if isinstance(value, str)}
            files = [value for _, value in form.multi_items() if isinstance(value, UploadFile)]
            name, content = (files[0].filename or "", await files[0].read()) if files else ("", b"")
    except (MultiPartException, HTTPException) as error:
        detail = getattr(error, "message", None) or getattr(error, "detail", "")
        raise MalformedBody(f"the form cannot be read: {detail}") from None
    if not texts.get("image", "-"):
        # A form without a chosen file sends a blank field in its place.
        del texts["image"]
    return texts, name, content


def laser_of(text: str) -> Form | None:
    """The evaluation that travels along as the query of its address; None where there is none."""
    if not text:
        return None
    try:
        items = parse_qsl(text, keep_blank_values=True, max_num_fields=MAX_PARAMETERS)
    except ValueError:
        raise BadAddress("the evaluation in the address cannot be read") from None
    return Form.read(items)


def image_body(name: str, content: bytes) -> dict[str, Any]:
    """Image and format of a file as fields of a request. Raises InvalidRequest."""
    kind = ENDINGS.get(name.rpartition(".")[2].lower())
    if not content or kind is None:
        error = FieldError(
            field="image",
            value=name[:100],
            allowed="a file ending in png, tif, tiff, csv or txt",
            message="no such file was sent",
            remedy="Choose the camera's image.",
        )
        raise InvalidRequest("no image", [error])
    if kind == "csv":
        return {"image": content.decode("utf-8", "replace"), "format": kind}
    return {"image": base64.b64encode(content).decode(), "format": kind}


def _request(
    sheet: Sheet, laser: Form | None, name: str, content: bytes, errors: list[FieldError]
) -> ProfileRequest:
    body = sheet.body(errors)
    if "apertures_mm" in body:
        try:
            body["apertures_mm"] = [parse_number(word) for word in str(body["apertures_mm"]).split()]
        except NotANumber as error:
            errors.append(
                FieldError(
                    field="apertures_mm",
                    value=sheet.get("apertures_mm")[:100],
                    allowed="diameters in mm, parted by blanks",
                    message=str(error),
                    remedy=error.remedy,
                )
            )
    body |= image_body(name, content)
    if laser is not None:
        body["evaluation"] = laser.request().model_dump(mode="json", exclude_unset=True)
    return sheet.validated(ProfileRequest, body, errors)


def _judge(request: ProfileRequest) -> tuple[ProfileResult, Heat, Picture]:
    image = picture(request)
    return profile(request, image), heat(image.signal, image.pixel_m), image


def _page(
    request: Request, sheet: Sheet, laser: Form | None, errors: list[FieldError], **more: Any
) -> Response:
    return page(
        request,
        "bounds/profile.html",
        status=422 if errors else 200,
        form=sheet,
        laser=laser,
        errors=errors,
        error_of={e.field: e for e in reversed(errors)},
        cautions=cautions(),
        **{"result": None, "heat": None, **more},
    )


@router.get("/profile")
async def profile_page(request: Request) -> Response:
    """The blank form, for an evaluation where its query is given."""
    return _page(request, Sheet(GROUPS), laser_of(request.url.query), [])


@router.post("/profile")
async def profile_answer(request: Request) -> Response:
    """The form with its answer."""
    texts, name, content = await form_parts(request)
    laser = laser_of(texts.pop("laser", ""))
    sheet = Sheet.read(GROUPS, texts.items())
    errors: list[FieldError] = []
    try:
        wanted = _request(sheet, laser, name, content, errors)
        result, drawn, _ = await run_in_threadpool(_judge, wanted)
    except InvalidRequest as problem:
        return _page(request, sheet, laser, in_words(problem.errors))
    return _page(request, sheet, laser, [], result=result, heat=drawn)
