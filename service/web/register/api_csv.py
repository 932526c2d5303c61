"""The register as CSV, in and out."""

from __future__ import annotations

from typing import Annotated, Any

from fastapi import APIRouter, Depends
from starlette.requests import Request
from starlette.responses import Response, StreamingResponse

from service.contract.problem import UnsupportedMedia
from service.contract.result import Model
from service.contract.strict import Strict
from service.register.importing import Imported, import_all
from service.register.listing import Filters
from service.web.body import read_limited
from service.web.register.access import Edit, Store, View
from service.web.register.bodies import queried, schema_parameters
from service.web.register.csv_columns import COLUMNS, RESULTS, exported
from service.web.register.csv_read import read_csv

__all__ = ["EXPORT_HEADERS", "router"]

router = APIRouter(prefix="/api/v1", tags=["register"])
EXPORT_HEADERS = {"content-disposition": 'attachment; filename="lasers.csv"', "cache-control": "no-store"}


class ImportFlags(Strict):
    """How to import."""

    check_only: bool = False


class Column(Model):
    """A column of the CSV form."""

    name: str
    holds: str
    imported: bool


async def _csv(request: Request) -> bytes:
    media = request.headers.get("content-type", "").partition(";")[0].strip().lower()
    if media != "text/csv":
        raise UnsupportedMedia(f"content-type is {media[:100]!r}; send text/csv")
    return await read_limited(request, request.app.state.settings.import_limit)


Csv = Annotated[bytes, Depends(_csv)]
BODY: dict[str, Any] = {
    "requestBody": {"required": True, "content": {"text/csv": {"schema": {"type": "string"}}}},
    **schema_parameters(ImportFlags),
}


@router.post("/lasers/import", response_model=Imported, summary="Import lasers from CSV", openapi_extra=BODY)
def post_import(request: Request, actor: Edit, database: Store, data: Csv) -> Response:
    """Creates lasers with a new asset tag, changes the others; where there is an error, none is stored."""
    flags, _ = queried(ImportFlags, request)
    found = import_all(database, actor, read_csv(data), flags.check_only)
    return Response(found.model_dump_json(), media_type="application/json")


@router.get("/lasers/export", summary="Export lasers as CSV", openapi_extra=schema_parameters(Filters))
def get_export(request: Request, actor: View, database: Store) -> Response:
    """The lasers that the filters name; the file can be imported again."""
    filters, _ = queried(Filters, request)
    return StreamingResponse(exported(database, filters), media_type="text/csv", headers=EXPORT_HEADERS)


@router.get("/lasers/columns", response_model=list[Column], summary="Columns of the CSV form")
def get_columns(actor: View) -> Response:
    """Name and meaning of every column; result columns are written and ignored when read."""
    found = [Column(name=n, holds=h, imported=True) for n, h in COLUMNS.items()]
    found += [Column(name=n, holds=h, imported=False) for n, h in RESULTS.items()]
    return Response(f"[{','.join(c.model_dump_json() for c in found)}]", media_type="application/json")
