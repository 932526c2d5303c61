"""Pages that let a reader judge the numbers: published checks and changes."""

from __future__ import annotations

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response

from service.contract.changes import change_list
from service.contract.checks import SUBJECTS, checks
from service.contract.problem import NotFound
from service.web.templates import page

__all__ = ["router"]

router = APIRouter(include_in_schema=False)


@router.get("/checks")
async def checks_page(request: Request, subject: str = "") -> Response:
    """Published values beside what this service computes; status 503 where one is not met."""
    if subject and subject not in SUBJECTS:
        raise NotFound(f"there is no subject {subject[:100]!r}; there are {', '.join(SUBJECTS)}")
    found = checks()
    groups = {key: [c for c in found.checks if c.subject == key] for key in SUBJECTS if subject in ("", key)}
    status = 503 if found.failed else 200
    return page(
        request, "checks.html", status=status, found=found, groups=groups, subjects=SUBJECTS, chosen=subject
    )


@router.get("/changes")
async def changes_page(request: Request) -> Response:
    """Every change that can move a result."""
    return page(request, "changes.html", changes=change_list())
