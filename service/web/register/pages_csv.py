"""The page for CSV in and out."""

from __future__ import annotations

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response, StreamingResponse

from service.contract.problem import Problem
from service.register.importing import Imported, import_all
from service.register.listing import Filters
from service.web.register.access import Edit, Store, View
from service.web.register.api_csv import EXPORT_HEADERS
from service.web.register.bodies import FormFields, queried
from service.web.register.csv_columns import COLUMNS, RESULTS, exported
from service.web.register.csv_read import read_csv
from service.web.register.render import register_page

__all__ = ["router"]

router = APIRouter(include_in_schema=False)


def _page(
    request: Request, actor: Edit, problem: Problem | None = None, result: Imported | None = None
) -> Response:
    return register_page(
        request, actor, "csv.html", problem=problem, result=result, columns=COLUMNS, results=RESULTS
    )


@router.get("/lasers/import")
def import_page(request: Request, actor: Edit) -> Response:
    """Upload a file; what the columns hold."""
    return _page(request, actor)


@router.post("/lasers/import")
def import_file(request: Request, actor: Edit, database: Store, fields: FormFields) -> Response:
    """Import the file, or only check it."""
    given = fields.get("file", b"")
    data = given if isinstance(given, bytes) else str(given).encode()
    try:
        result = import_all(database, actor, read_csv(data), fields.get("step") == "check")
    except Problem as problem:
        return _page(request, actor, problem)
    return _page(request, actor, result=result)


@router.get("/lasers.csv")
def export_file(request: Request, actor: View, database: Store) -> Response:
    """The lasers that the filters name."""
    filters = Filters()
    if request.url.query:
        filters, _ = queried(Filters, request)
    return StreamingResponse(exported(database, filters), media_type="text/csv", headers=EXPORT_HEADERS)
