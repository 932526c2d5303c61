"""The rule sets as pages: tables to hold against the printed documents."""

from __future__ import annotations

from dataclasses import dataclass

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response

from service.contract.answer import rule_sets
from service.contract.classification import schemes
from service.contract.problem import NotFound
from service.files import DATA
from service.rules.eyewear import eyewear_tables
from service.rules.tables import Row, read_rows
from service.web.templates import page

__all__ = ["router"]

router = APIRouter(include_in_schema=False)


@dataclass(frozen=True, slots=True)
class BasisRow(Row):
    """What the limits behind a filter are taken to be: E [W/m2] or H [J/m2], by test mode and band."""

    mode: str
    wavelength_from_nm: float
    wavelength_to_nm: float
    quantity: str
    value: float


@router.get("/rules")
async def rules_page(request: Request) -> Response:
    """All rule sets with their standing."""
    return page(
        request,
        "rules.html",
        rule_sets=[c.rules for c in rule_sets().values()],
        schemes=[c.scheme for c in schemes().values()],
    )


@router.get("/classes")
async def schemes_page(request: Request) -> Response:
    """All classification schemes with their standing."""
    return page(request, "classes.html", schemes=[c.scheme for c in schemes().values()])


@router.get("/eyewear")
async def eyewear_page(request: Request) -> Response:
    """Scale numbers, test modes and rules of use as tables."""
    tables = eyewear_tables(DATA)
    basis = read_rows(DATA / "eyewear" / "basis.csv", BasisRow, tables.sources)
    rows: list[Row] = [*tables.scales, *basis, *tables.modes, *tables.alignment, *tables.use.values()]
    named = {row.source for row in rows}
    documents = [source for key, source in tables.sources.items() if key in named]
    return page(request, "eyewear.html", rules=tables, basis=basis, documents=documents)


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
