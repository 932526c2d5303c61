"""The rule sets as pages: tables to hold against the printed documents."""

from __future__ import annotations

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response

from service.contract.answer import rule_sets
from service.contract.classification import schemes
from service.contract.problem import NotFound
from service.web.templates import page

__all__ = ["router"]

router = APIRouter(include_in_schema=False)


@router.get("/rules")
async def rules_page(request: Request) -> Response:
    """All rule sets with their standing."""
    return page(
        request,
        "rules.html",
        rule_sets=[c.rules for c in rule_sets().values()],
        schemes=[c.scheme for c in schemes().values()],
    )


@router.get("/classes/{scheme_id}")
async def scheme_page(request: Request, scheme_id: str) -> Response:
    """One classification scheme as tables."""
    found = schemes().get(scheme_id)
    if found is None:
        raise NotFound(
            f"there is no classification scheme {scheme_id[:100]!r}; there are {', '.join(schemes())}"
        )
    return page(request, "scheme.html", rules=found.scheme)


@router.get("/rules/{rules_id}")
async def rule_set_page(request: Request, rules_id: str) -> Response:
    """One rule set as tables."""
    found = rule_sets().get(rules_id)
    if found is None:
        raise NotFound(f"there is no rule set {rules_id[:100]!r}; there are {', '.join(rule_sets())}")
    return page(request, "ruleset.html", rules=found.rules)
