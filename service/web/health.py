"""Health: alive, and ready to compute."""

from __future__ import annotations

from fastapi import APIRouter
from pydantic import BaseModel
from starlette.responses import Response

from service import __version__
from service.contract.answer import rule_sets
from service.contract.checks import checks

__all__ = ["router"]


class Readiness(BaseModel):
    """Whether this process may be asked for results."""

    status: str
    version: str
    rules: dict[str, str]
    failed_checks: list[str]


router = APIRouter(prefix="/health", tags=["operation"])


@router.get("/live", summary="The process answers")
async def live() -> dict[str, str]:
    """Alive."""
    return {"status": "live"}


@router.get(
    "/ready",
    response_model=Readiness,
    summary="The rule tables are loaded and every published check is met",
    responses={503: {"model": Readiness, "description": "At least one published check is not met"}},
)
async def ready() -> Response:
    """Ready, with the digest of every rule set; status 503 names the published checks that are not met."""
    digests = {key: compiled.rules.digest for key, compiled in rule_sets().items()}
    failed = checks().failed
    status = "not ready: published checks are not met" if failed else "ready"
    body = Readiness(status=status, version=__version__, rules=digests, failed_checks=failed)
    return Response(body.model_dump_json(), 503 if failed else 200, media_type="application/json")
