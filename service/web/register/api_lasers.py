"""The register as JSON: lasers, revisions, sign-off, eyewear that will do."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import Any

from fastapi import APIRouter
from pydantic import Field
from starlette.requests import Request
from starlette.responses import Response

from service.contract.evaluation import EvaluationResult
from service.contract.result import Model
from service.contract.strict import Strict
from service.register import flow, lasers, matching, stored
from service.register.database import Database
from service.register.difference import Change, differences, figures_differences
from service.register.figures import canonical, kept
from service.register.listing import Filters, overview, page_of
from service.register.matching import Cover, PairMatch
from service.register.models import (
    DecisionIn,
    Laser,
    LaserIn,
    LaserPage,
    Reason,
    ReviewIn,
    Revision,
    RevisionDocument,
)
from service.register.problems import Conflict
from service.register.replies import Reply, earlier, keep
from service.web.register.access import Approve, Edit, Store, View
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

__all__ = ["EvaluateAnewIn", "router"]

router = APIRouter(prefix="/api/v1", tags=["register"])
JSON = "application/json"
PAGE = (
    ("limit", "Lasers on a page, 1 to 500; 50 by default."),
    ("cursor", "The field next of the page before."),
)
Step = Callable[..., None]


class EvaluateAnewIn(Strict):
    """Why the same request is evaluated again."""

    reason: Reason = "evaluated anew under the tables in use"


class Difference(Model):
    """What differs between two revisions."""

    inputs: list[dict[str, Any]] = Field(description="Field, old and new; null = not given.")
    figures: list[dict[str, Any]]


def _laser(request: Request, database: Database, laser_id: int, status: int = 200) -> Response:
    """A laser with its ETag."""
    with database.read() as connection:
        found = stored.laser(connection, laser_id)
    tag = etag("laser", found.id, found.version)
    if request.method == "GET" and tag in request.headers.get("if-none-match", ""):
        return Response(status_code=304, headers={"etag": tag})
    headers = {"etag": tag, "cache-control": "no-store"}
    return Response(found.model_dump_json(), status, headers=headers, media_type=JSON)


def _json(text: str, **headers: str) -> Response:
    return Response(text, media_type=JSON, headers={"cache-control": "no-store", **headers})


@router.get(
    "/lasers",
    response_model=LaserPage,
    summary="Lasers of the register, page by page",
    openapi_extra=schema_parameters(Filters, *PAGE),
)
def get_lasers(request: Request, actor: View, database: Store) -> Response:
    """Search, filters and order as parameters; follow `next` until it is null."""
    filters, beside = queried(Filters, request, "limit", "cursor")
    limit = number_of(beside, "limit", 50, 1, 500)
    with database.read() as connection:
        found = page_of(connection, filters, limit, beside.get("cursor"))
    return _json(found.model_dump_json())


@router.post("/lasers", status_code=201, response_model=Laser, summary="Store a laser as a draft")
def post_laser(request: Request, actor: Edit, database: Store, data: JsonBody) -> Response:
    """Evaluates the request and stores it as revision 1. An Idempotency-Key makes a retry harmless."""
    body, key = parsed(LaserIn, data), idempotency_key(request)
    sent = canonical(body.model_dump(mode="json"))
    result = kept(body.asked)
    with database.write() as connection:
        reply = earlier(connection, actor, key, sent)
        if reply is None:
            new = lasers.create(connection, actor, body, result)
            found = stored.laser(connection, new)
            reply = Reply(found.model_dump_json(), f"/api/v1/lasers/{new}")
            keep(connection, actor, key, sent, reply)
    tag = etag("laser", int(reply.location.rpartition("/")[2]), 1)
    headers = {"location": reply.location, "etag": tag, "cache-control": "no-store"}
    return Response(reply.body, 201, headers=headers, media_type=JSON)


@router.get("/lasers/{laser_id:int}", response_model=Laser, summary="One laser")
def get_laser(request: Request, actor: View, database: Store, laser_id: int) -> Response:
    """Identity, request and key figures of the current revision."""
    return _laser(request, database, laser_id)


@router.put("/lasers/{laser_id:int}", response_model=Laser, summary="Change a laser")
def put_laser(request: Request, actor: Edit, database: Store, data: JsonBody, laser_id: int) -> Response:
    """Replaces identity and request; another request makes a new revision, a draft. Needs If-Match."""
    version = if_match(request, "laser", laser_id)
    body = parsed(LaserIn, data)
    with database.read() as connection:
        result = lasers.prepared(connection, laser_id, version, body)
    with database.write() as connection:
        lasers.update(connection, actor, laser_id, version, body, result)
    return _laser(request, database, laser_id)


@router.delete("/lasers/{laser_id:int}", response_model=Laser, summary="Retire a laser")
def delete_laser(request: Request, actor: Edit, database: Store, laser_id: int) -> Response:
    """Takes the laser out of use. Nothing is removed: it stays with its history. Needs If-Match."""
    version = if_match(request, "laser", laser_id)
    with database.write() as connection:
        flow.retire(connection, actor, laser_id, version)
    return _laser(request, database, laser_id)


@router.post("/lasers/{laser_id:int}/reinstate", response_model=Laser, summary="Take a retired laser back")
def reinstate(request: Request, actor: Edit, database: Store, data: JsonBody, laser_id: int) -> Response:
    """The laser is a draft again; nothing is in force until it is approved. Body: {}."""
    parsed(Strict, data)
    version = if_match(request, "laser", laser_id, needed=False)
    with database.write() as connection:
        flow.reinstate(connection, actor, laser_id, version)
    return _laser(request, database, laser_id)


@router.post(
    "/lasers/{laser_id:int}/evaluate-anew", response_model=Laser, summary="The same request, tables in use"
)
def evaluate_anew(request: Request, actor: Edit, database: Store, data: JsonBody, laser_id: int) -> Response:
    """Makes a new draft revision with the same request, evaluated under the tables in use."""
    body = parsed(EvaluateAnewIn, data)
    version = if_match(request, "laser", laser_id, needed=False)
    with database.write() as connection:
        flow.evaluate_anew(connection, actor, laser_id, body.reason, version)
    return _laser(request, database, laser_id)


@router.put("/lasers/{laser_id:int}/review", response_model=Laser, summary="Set the next review")
def put_review(request: Request, actor: Edit, database: Store, data: JsonBody, laser_id: int) -> Response:
    """Sets the date of the next review, or takes it away."""
    body = parsed(ReviewIn, data)
    version = if_match(request, "laser", laser_id, needed=False)
    with database.write() as connection:
        flow.review(connection, actor, laser_id, body.review_due, version)
    return _laser(request, database, laser_id)


@router.get(
    "/lasers/{laser_id:int}/evaluation",
    response_model=EvaluationResult,
    summary="The whole result of the current revision",
)
def get_evaluation(actor: View, database: Store, laser_id: int) -> Response:
    """As POST /api/v1/evaluate answered it when the revision was made."""
    with database.read() as connection:
        row = stored.laser_row(connection, laser_id)
        revision = stored.revision_row(connection, laser_id, row["revision"])
    text = flow.whole_result(revision)
    if text is None:
        raise Conflict(
            "the whole result of this draft was not kept and the tables have changed since; evaluate it anew"
        )
    return _json(text)


@router.get(
    "/lasers/{laser_id:int}/eyewear", response_model=list[PairMatch], summary="Pairs on the shelf, judged"
)
def get_laser_eyewear(actor: View, database: Store, laser_id: int) -> Response:
    """Every pair in use against the current revision; those that will do first."""
    found = matching.pairs_for(database, laser_id)
    return _json(f"[{','.join(m.model_dump_json() for m in found)}]")


@router.get(
    "/lasers/{laser_id:int}/revisions", response_model=list[Revision], summary="The history of a laser"
)
def get_revisions(actor: View, database: Store, laser_id: int) -> Response:
    """Every revision with its decisions, the newest first."""
    with database.read() as connection:
        found = stored.history(connection, laser_id)
    return _json(f"[{','.join(r.model_dump_json() for r in found)}]")


@router.get(
    "/lasers/{laser_id:int}/revisions/{number:int}", response_model=RevisionDocument, summary="One revision"
)
def get_revision(actor: View, database: Store, laser_id: int, number: int) -> Response:
    """A revision with its request and, where it is kept, the whole result."""
    with database.read() as connection:
        found = stored.revision_document(connection, laser_id, number)
    return _json(found.model_dump_json())


@router.get(
    "/lasers/{laser_id:int}/difference/{old:int}/{new:int}",
    response_model=Difference,
    summary="What differs between two revisions",
)
def get_difference(actor: View, database: Store, laser_id: int, old: int, new: int) -> Response:
    """Inputs and key figures that differ, old beside new."""
    with database.read() as connection:
        a = stored.revision_document(connection, laser_id, old)
        b = stored.revision_document(connection, laser_id, new)

    def told(changes: list[Change]) -> list[dict[str, Any]]:
        return [{"field": c.field, "old": c.old, "new": c.new} for c in changes]

    found = Difference(
        inputs=told(differences(a.request, b.request)),
        figures=told(figures_differences(a.figures, b.figures)),
    )
    return _json(found.model_dump_json())


def _step(
    request: Request, database: Database, actor: Any, data: Any, laser_id: int, number: int, step: Step
) -> Response:
    body = parsed(DecisionIn, data)
    version = if_match(request, "laser", laser_id, needed=False)
    with database.write() as connection:
        step(connection, actor, laser_id, number, body, version)
    return _laser(request, database, laser_id)


REVISION = "/lasers/{laser_id:int}/revisions/{number:int}"


@router.post(f"{REVISION}/submit", response_model=Laser, summary="Ask for a decision")
def submit(
    request: Request, actor: Edit, database: Store, data: JsonBody, laser_id: int, number: int
) -> Response:
    """The whole result is kept from here on."""
    return _step(request, database, actor, data, laser_id, number, flow.submit)


@router.post(f"{REVISION}/withdraw", response_model=Laser, summary="Take a submitted revision back")
def withdraw(
    request: Request, actor: Edit, database: Store, data: JsonBody, laser_id: int, number: int
) -> Response:
    """It is a draft again."""
    return _step(request, database, actor, data, laser_id, number, flow.withdraw)


@router.post(f"{REVISION}/approve", response_model=Laser, summary="Approve a submitted revision")
def approve(
    request: Request, actor: Approve, database: Store, data: JsonBody, laser_id: int, number: int
) -> Response:
    """It is in force and locked; the one before is superseded."""
    four_eyes = request.app.state.settings.four_eyes == "on"
    approval = partial(flow.approve, four_eyes=four_eyes)
    return _step(request, database, actor, data, laser_id, number, approval)


@router.post(f"{REVISION}/return", response_model=Laser, summary="Return a submitted revision")
def return_(
    request: Request, actor: Approve, database: Store, data: JsonBody, laser_id: int, number: int
) -> Response:
    """With a comment that says what has to change."""
    return _step(request, database, actor, data, laser_id, number, flow.return_)


class Overview(Model):
    """Counts of the register."""

    by_class: dict[str, int]
    by_status: dict[str, int]
    in_use: int
    overdue: int
    no_review: int
    stale: int = Field(description="Lasers whose figures were made with other tables.")
    unbounded: int
    eyewear: Cover


@router.get("/overview", response_model=Overview, summary="The register at a glance")
def get_overview(actor: View, database: Store) -> Response:
    """Lasers by class and status, overdue, with other tables, without suitable eyewear."""
    with database.read() as connection:
        counts = overview(connection)
    found = Overview(**counts, eyewear=matching.without_eyewear(database))
    return _json(found.model_dump_json())
