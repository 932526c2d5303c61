"""The page steps of an approver: approve and return."""

from __future__ import annotations

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response

from service.contract.problem import Problem
from service.register import flow
from service.register.models import DecisionIn
from service.web.register.access import Approve, Store
from service.web.register.bodies import FormFields, parsed
from service.web.register.pages_lasers import laser_page_with, posted_version, unknown_step
from service.web.register.render import see

__all__ = ["router"]

router = APIRouter(include_in_schema=False)


@router.post("/lasers/{laser_id:int}/revisions/{number:int}")
def decide(
    request: Request, actor: Approve, database: Store, laser_id: int, number: int, fields: FormFields
) -> Response:
    """Approve the revision, or return it with a comment."""
    step, version = str(fields.get("step", "")), posted_version(fields)
    given = {"comment": str(fields.get("comment", "")), "review_due": str(fields.get("review_due", ""))}
    try:
        body = parsed(DecisionIn, given)
        with database.write() as connection:
            if step == "approve":
                four_eyes = request.app.state.settings.four_eyes == "on"
                flow.approve(connection, actor, laser_id, number, body, version, four_eyes)
            elif step == "return":
                flow.return_(connection, actor, laser_id, number, body, version)
            else:
                raise unknown_step(step)
    except Problem as problem:
        return laser_page_with(request, actor, database, laser_id, problem=problem)
    return see(f"/lasers/{laser_id}", done=step)
