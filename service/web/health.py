"""Health: alive, and ready to compute."""

from __future__ import annotations

from fastapi import APIRouter

from service import __version__
from service.contract.answer import rule_sets

__all__ = ["router"]

router = APIRouter(prefix="/health", tags=["operation"])


@router.get("/live", summary="The process answers")
async def live() -> dict[str, str]:
    """Alive."""
    return {"status": "live"}


@router.get("/ready", summary="The rule tables are loaded")
async def ready() -> dict[str, str | dict[str, str]]:
    """Ready, with the digest of every rule set."""
    digests = {key: compiled.rules.digest for key, compiled in rule_sets().items()}
    return {"status": "ready", "version": __version__, "rules": digests}
