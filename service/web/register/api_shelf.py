"""The eyewear shelf and re-evaluation of the register as JSON."""

from __future__ import annotations

from fastapi import APIRouter
from pydantic import Field
from starlette.requests import Request
from starlette.responses import Response

from service.contract.result import Model
from service.contract.strict import Strict
from service.register import matching, reevaluate, shelf
from service.register.database import Database
from service.register.figures import canonical
from service.register.matching import LaserMatch
from service.register.models import EyewearIn, EyewearRecord
from service.register.reevaluate import Changed, Run
from service.register.replies import Reply, earlier, keep
from service.web.register.access import Edit, Store, View
from service.web.register.bodies import (
    JsonBody,
    etag,
    idempotency_key,
    if_match,
    number_of,
    parsed,
    queried,
    schema_parameters,
)

__all__ = ["AdoptIn", "router"]

router = APIRouter(prefix="/api/v1", tags=["register"])
JSON = "application/json"
PAGE = (
    ("limit", "Entries on a page, 1 to 500; 50 by default."),
    ("cursor", "The field next of the page before."),
)


class ShelfPage(Model):
    """One page of the shelf; `next` is the cursor of the following page."""

    items: list[EyewearRecord]
    next: str | None


class Covered(Model):
    """Lasers that need eyewear against one pair."""

    items: list[LaserMatch]
    unexamined: int = Field(description="Lasers not looked at yet; ask again.")


class AdoptIn(Strict):
    """Which lasers of a re-evaluation get a new revision."""

    laser_ids: list[int] | None = Field(
        None, max_length=100_000, description="Ids; null = every laser that changed."
    )


class Adopted(Model):
    """Lasers that got a new draft revision, and those left out with the reason."""

    adopted: list[int]
    left_out: list[str]


def _json(text: str, status: int = 200, **headers: str) -> Response:
    return Response(text, status, media_type=JSON, headers={"cache-control": "no-store", **headers})


def _pair(request: Request, database: Database, eyewear_id: int) -> Response:
    with database.read() as connection:
        found = shelf.record_of(shelf.shelf_row(connection, eyewear_id))
    tag = etag("eyewear", found.id, found.version)
    if request.method == "GET" and tag in request.headers.get("if-none-match", ""):
        return Response(status_code=304, headers={"etag": tag})
    return _json(found.model_dump_json(), etag=tag)


@router.get(
    "/eyewear",
    response_model=ShelfPage,
    summary="The eyewear shelf",
    openapi_extra=schema_parameters(Strict, *PAGE),
)
def get_shelf(request: Request, actor: View, database: Store) -> Response:
    """Pairs with markings, quantity, place and date of inspection, page by page."""
    _, beside = queried(Strict, request, "limit", "cursor")
    limit = number_of(beside, "limit", 50, 1, 500)
    after = number_of(beside, "cursor", 0, 0, 2**31 - 1)
    with database.read() as connection:
        rows = shelf.shelf_list(connection, after=after, limit=limit + 1)
    items = [shelf.record_of(r) for r in rows[:limit]]
    more = str(items[-1].id) if len(rows) > limit else None
    return _json(ShelfPage(items=items, next=more).model_dump_json())


@router.post("/eyewear", status_code=201, response_model=EyewearRecord, summary="Put pairs on the shelf")
def post_eyewear(request: Request, actor: Edit, database: Store, data: JsonBody) -> Response:
    """Pairs of one kind. An Idempotency-Key makes a retry harmless."""
    body, key = parsed(EyewearIn, data), idempotency_key(request)
    sent = canonical(body.model_dump(mode="json"))
    with database.write() as connection:
        reply = earlier(connection, actor, key, sent)
        if reply is None:
            new = shelf.add(connection, actor, body)
            found = shelf.record_of(shelf.shelf_row(connection, new))
            reply = Reply(found.model_dump_json(), f"/api/v1/eyewear/{new}")
            keep(connection, actor, key, sent, reply)
    tag = etag("eyewear", int(reply.location.rpartition("/")[2]), 1)
    return _json(reply.body, 201, location=reply.location, etag=tag)


@router.get("/eyewear/{eyewear_id:int}", response_model=EyewearRecord, summary="Pairs of one kind")
def get_eyewear(request: Request, actor: View, database: Store, eyewear_id: int) -> Response:
    """Markings, quantity, place and date of inspection."""
    return _pair(request, database, eyewear_id)


@router.put("/eyewear/{eyewear_id:int}", response_model=EyewearRecord, summary="Change pairs of one kind")
def put_eyewear(request: Request, actor: Edit, database: Store, data: JsonBody, eyewear_id: int) -> Response:
    """Replaces everything about them; `retired` takes them out of use. Needs If-Match."""
    version = if_match(request, "eyewear", eyewear_id)
    body = parsed(EyewearIn, data)
    with database.write() as connection:
        shelf.change(connection, actor, eyewear_id, version, body)
    return _pair(request, database, eyewear_id)


@router.get("/eyewear/{eyewear_id:int}/lasers", response_model=Covered, summary="Which lasers a pair covers")
def get_covered(actor: View, database: Store, eyewear_id: int) -> Response:
    """Every laser in use that exceeds a limit of the eye, those covered first."""
    items, left = matching.lasers_for(database, eyewear_id)
    return _json(Covered(items=items, unexamined=left).model_dump_json())


@router.get("/reevaluations", response_model=list[Run], summary="Passes over the register")
def get_runs(actor: View, database: Store) -> Response:
    """The latest passes, the newest first."""
    with database.read() as connection:
        found = reevaluate.runs(connection)
    return _json(f"[{','.join(r.model_dump_json() for r in found)}]")


@router.post(
    "/reevaluations", status_code=202, response_model=Run, summary="Evaluate the register anew, adopt nothing"
)
def post_run(actor: Edit, database: Store, data: JsonBody) -> Response:
    """Starts a pass over every laser in use under the tables in use. Body: {}."""
    parsed(Strict, data)
    run_id = reevaluate.start(database, actor)
    with database.read() as connection:
        found = reevaluate.run_of(connection, run_id)
    return _json(found.model_dump_json(), 202, location=f"/api/v1/reevaluations/{run_id}")


@router.get("/reevaluations/{run_id:int}", response_model=Run, summary="Progress of a pass")
def get_run(actor: View, database: Store, run_id: int) -> Response:
    """State, how many lasers are done and how many would change."""
    with database.read() as connection:
        found = reevaluate.run_of(connection, run_id)
    return _json(found.model_dump_json())


@router.get(
    "/reevaluations/{run_id:int}/changes", response_model=list[Changed], summary="What a pass would change"
)
def get_changes(actor: View, database: Store, run_id: int) -> Response:
    """Every laser whose class, distance or density would change, old beside new."""
    with database.read() as connection:
        found = reevaluate.changes_of(connection, run_id)
    return _json(f"[{','.join(c.model_dump_json() for c in found)}]")


@router.post(
    "/reevaluations/{run_id:int}/adopt", response_model=Adopted, summary="Adopt the changes of a pass"
)
def post_adopt(actor: Edit, database: Store, data: JsonBody, run_id: int) -> Response:
    """Gives each laser named (or every one that changed) a new draft revision, to be submitted as any."""
    body = parsed(AdoptIn, data)
    with database.write() as connection:
        done, left = reevaluate.adopt(connection, actor, run_id, body.laser_ids)
    return _json(Adopted(adopted=done, left_out=left).model_dump_json())
