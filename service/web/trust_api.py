"""The same as JSON: published checks, differences between rule sets, changes."""

from __future__ import annotations

from typing import Annotated

from fastapi import APIRouter, Query
from starlette.responses import Response

from service.contract.changes import Change, change_list
from service.contract.checks import SUBJECTS, Checks, checks
from service.contract.problem import NotFound

__all__ = ["router"]

router = APIRouter(prefix="/api/v1", tags=["trust"])


@router.get(
    "/checks",
    response_model=Checks,
    summary="Published values, computed anew",
    responses={503: {"model": Checks, "description": "At least one check is not met"}},
)
async def get_checks(
    subject: Annotated[str, Query(description=f"One of: {', '.join(SUBJECTS)}.")] = "",
) -> Response:
    """Each printed value with its source, what this service computes, deviation and verdict."""
    if subject and subject not in SUBJECTS:
        raise NotFound(f"there is no subject {subject[:100]!r}; there are {', '.join(SUBJECTS)}")
    found = checks()
    shown = found.model_copy(update={"checks": [c for c in found.checks if subject in ("", c.subject)]})
    status = 503 if found.failed else 200
    return Response(shown.model_dump_json(), status, media_type="application/json")


@router.get("/changes", summary="Changes that can move a result")
async def get_changes() -> list[Change]:
    """Newest first, with the digest of every rule set, scheme and table since then."""
    return change_list()
