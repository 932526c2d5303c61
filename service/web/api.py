"""Contract v1: evaluate, compare and the rule sets as JSON."""

from __future__ import annotations

from typing import Annotated, Any

from fastapi import APIRouter, Depends
from starlette.responses import Response

from service.contract.answer import answer, compare, rule_sets
from service.contract.classification import schemes
from service.contract.evaluation import Comparison, EvaluationResult
from service.contract.problem import NotFound
from service.contract.request import EvaluationRequest
from service.contract.rules import (
    MaterialSummary,
    RuleSetDocument,
    RuleSetSummary,
    SchemeDocument,
    material_list,
    rule_set_document,
    rule_set_summary,
    scheme_document,
)
from service.web.body import read_request

__all__ = ["router"]

router = APIRouter(prefix="/api/v1")

Body = Annotated[EvaluationRequest, Depends(read_request)]


def _json(model: Any) -> Response:
    return Response(model.model_dump_json(), media_type="application/json")


@router.post("/evaluate", response_model=EvaluationResult, tags=["evaluation"], summary="Evaluate one laser")
async def post_evaluate(body: Body) -> Response:
    """Exposure limits, hazard distances and optical density for eye and skin, with the working."""
    return _json(answer(body))


@router.post(
    "/compare", response_model=Comparison, tags=["evaluation"], summary="One laser under every rule set"
)
async def post_compare(body: Body) -> Response:
    """The same evaluation under every rule set, the default rule set first."""
    return _json(compare(body))


@router.get("/rules", tags=["rules"], summary="The rule sets")
async def get_rules() -> list[RuleSetSummary]:
    """Id, title, standing and digest of every rule set, the default first."""
    return [rule_set_summary(c.rules) for c in rule_sets().values()]


@router.get("/rules/{rules_id}", tags=["rules"], summary="One rule set with its rows")
async def get_rule_set(rules_id: str) -> RuleSetDocument:
    """Every row, factor, aperture and duration of a rule set with its source."""
    found = rule_sets().get(rules_id)
    if found is None:
        raise NotFound(f"there is no rule set {rules_id[:100]!r}; there are {', '.join(rule_sets())}")
    return rule_set_document(found.rules)


@router.get("/classes", tags=["rules"], summary="The classification schemes")
async def get_schemes() -> list[RuleSetSummary]:
    """Id, title, standing and digest of every classification scheme, the default first."""
    return [rule_set_summary(c.scheme) for c in schemes().values()]


@router.get("/classes/{scheme_id}", tags=["rules"], summary="One classification scheme with its rows")
async def get_scheme(scheme_id: str) -> SchemeDocument:
    """Every limit, factor, measurement condition and time base of a scheme with its source."""
    found = schemes().get(scheme_id)
    if found is None:
        raise NotFound(f"there is no scheme {scheme_id[:100]!r}; there are {', '.join(schemes())}")
    return scheme_document(found.scheme)


@router.get("/materials", tags=["rules"], summary="Materials of reflectors")
async def get_materials() -> list[MaterialSummary]:
    """Refractive index or reflectance of common materials, with source."""
    return material_list()
