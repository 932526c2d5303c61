"""Sign and report of a stored laser: of the revision in force, as a file."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from fastapi import APIRouter
from starlette.concurrency import run_in_threadpool
from starlette.requests import Request
from starlette.responses import Response

from service.contract.report import PAPERS, ReportRequest, day_of
from service.register.database import Database
from service.register.in_force import InForce, check_holds, in_force
from service.register.problems import Conflict
from service.web.filled import form_of
from service.web.form import address_items
from service.web.register.access import Store, View
from service.web.register.render import see
from service.web.report import own_parameters, report_file, unknown_parameters
from service.web.sign import FORMATS, SignAnswer, base_address, sign_answer
from service.web.sign_form import LABELS, PREFIX, SIGN_VERSION, SignForm, choices, split
from service.web.typeset import MEDIA

__all__ = ["router"]

router = APIRouter()
#: Longest place that a sign takes as its room.
ROOM = 80
SIGN_MEDIA = {media: {"schema": {"type": "string"}} for media in MEDIA.values()}


def _parameter(name: str, text: str, offered: Sequence[str] = ()) -> dict[str, Any]:
    """One parameter for the OpenAPI document."""
    schema = {"type": "string", **({"enum": list(offered)} if offered else {})}
    return {"name": name, "in": "query", "schema": schema, **({"description": text} if text else {})}


SIGN_PARAMETERS = [
    _parameter("format", "Without it the form is chosen by Accept.", sorted(FORMATS.values())),
    _parameter(f"{PREFIX}v", "Version of the form; needed where one of the others is given.", [SIGN_VERSION]),
    *(
        _parameter(PREFIX + name, label, [key for key, _ in choices().get(name, ()) if key])
        for name, label in LABELS.items()
    ),
]


def _found(database: Database, laser_id: int) -> InForce:
    with database.read() as connection:
        found = in_force(connection, laser_id)
    check_holds(found)
    return found


def _sign_form(found: InForce, given: SignForm) -> SignForm:
    """The form of the sign with what the register knows; a revision that nobody approved says so."""
    values = {"date": found.made_on}
    if 0 < len(found.place) <= ROOM:
        values["room"] = found.place
    values |= given.values
    if not found.approved:
        values["extra_lines"] = "\n".join(filter(None, (given.get("extra_lines"), found.standing)))
    return SignForm(values)


@router.get("/lasers/{laser_id:int}/sign", include_in_schema=False)
@router.get(
    "/api/v1/lasers/{laser_id:int}/sign",
    tags=["register"],
    summary="The sign of a laser",
    response_model=SignAnswer,
    responses={200: {"content": SIGN_MEDIA}},
    openapi_extra={"parameters": SIGN_PARAMETERS},
)
async def get_sign(request: Request, actor: View, database: Store, laser_id: int) -> Response:
    """Of the revision in force, else of the newest, and then the sign says that it is not approved.

    By `Accept` or `?format=pdf|svg|png|json`; how it looks is said as in the address of the page of a sign
    (`sign-v=1&sign-family=ansi&sign-language=de`). 409 where the laser is retired, or where class, distance
    or density would no longer be those of the revision.
    """
    beside, own = split(address_items(request.url.query))
    given = SignForm.read(own)
    found = await run_in_threadpool(_found, database, laser_id)
    options = _sign_form(found, given).options(f"{base_address(request)}/lasers/{laser_id}")
    return _marked(await sign_answer(request, beside, found.request, options), found)


@router.get("/lasers/{laser_id:int}/sign/look", include_in_schema=False)
def choose_look(request: Request, actor: View, database: Store, laser_id: int) -> Response:
    """Lead to the page on which the look of the sign is chosen, filled in with what the register knows."""
    found = _found(database, laser_id)
    form = form_of(found.request)
    if form is None:
        raise Conflict(
            "the form cannot hold all of this laser, so the look is chosen in the address of its sign"
        )
    return see(f"/sign?{form.query()}&{_sign_form(found, SignForm()).query()}")


@router.get("/lasers/{laser_id:int}/report", include_in_schema=False)
@router.get(
    "/api/v1/lasers/{laser_id:int}/report",
    tags=["register"],
    summary="The report of a laser",
    response_class=Response,
    responses={200: {"content": {MEDIA["pdf"]: {}}, "description": "The report (PDF/UA-1)"}},
    openapi_extra={
        "parameters": [
            _parameter("paper", "", list(PAPERS)),
            _parameter("date", "Day of the report, as 2026-12-01; without it the present day (UTC)."),
        ]
    },
)
async def get_report(request: Request, actor: View, database: Store, laser_id: int) -> Response:
    """Of the revision in force, else of the newest; the report says which. 409 as for the sign."""
    beside, own = own_parameters(address_items(request.url.query))
    if beside:
        raise unknown_parameters(beside)
    found = await run_in_threadpool(_found, database, laser_id)
    asked = ReportRequest.model_validate({"evaluation": found.request, "place": found.place, **own})
    facts = [("Register", found.standing), ("Owner", found.owner)]
    return _marked(await report_file(asked, day_of(own["date"]), facts=facts), found)


def _marked(response: Response, found: InForce) -> Response:
    """The answer with the revision that it was made from."""
    response.headers["blinkline-revision"] = (
        f"{found.number}; {'approved' if found.approved else 'not approved'}"
    )
    return response
