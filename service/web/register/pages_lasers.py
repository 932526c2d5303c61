"""Pages of the register: the list, saving, a laser with its history, revisions side by side."""

from __future__ import annotations

import json
from typing import Any
from urllib.parse import urlencode

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response

from service.contract.answer import rule_sets
from service.contract.classification import schemes
from service.contract.problem import FieldError, InvalidRequest, Problem
from service.register import audit, flow, lasers, listing, matching, stored
from service.register.actor import Actor
from service.register.clock import today
from service.register.database import Database
from service.register.difference import differences, figures_differences
from service.register.figures import kept, request_from
from service.register.listing import Filters, page_of
from service.register.models import DecisionIn, LaserIn
from service.register.problems import field_error
from service.web.form import read_address
from service.web.register.access import Edit, Store, View
from service.web.register.address import evaluate_address, request_of_query
from service.web.register.bodies import FormFields, parsed, queried
from service.web.register.render import register_page, see

__all__ = ["laser_page_with", "posted_version", "router", "unknown_step"]

router = APIRouter(include_in_schema=False)
IDENTITY = ("asset_tag", "label", "place", "owner", "manufacturer", "review_due")
ON_PAGE = 50
#: Words of a done step, shown once after it.
DONE = {
    "created": "Stored as a draft.",
    "changed": "The change is stored.",
    "unchanged": "Nothing differed, so nothing was stored.",
    "submit": "Submitted: it awaits a decision.",
    "withdraw": "Taken back to draft.",
    "approve": "Approved: this revision is in force and locked.",
    "return": "Returned with your comment.",
    "retire": "Retired. The history stays.",
    "reinstate": "Taken back as a draft; nothing is in force until it is approved.",
    "anew": "Evaluated anew under the tables in use, as a new draft.",
    "review": "The next review is set.",
}


@router.get("/lasers")
def laser_list(request: Request, actor: View, database: Store) -> Response:
    """The register: search, filters, order, selection."""
    given = [p for p in request.query_params.multi_items() if p[1] != ""]
    filters, beside = queried(Filters, request, "cursor") if given else (Filters(), {})
    with database.read() as connection:
        found = page_of(connection, filters, ON_PAGE, beside.get("cursor") or None)
    kept_filters = {k: v for k, v in filters.model_dump(mode="json").items() if v not in ("", None, False)}
    if kept_filters.get("sort") == "asset_tag":
        del kept_filters["sort"]
    words = {k: ("true" if v is True else str(v)) for k, v in kept_filters.items()}
    return register_page(
        request,
        actor,
        "lasers.html",
        found=found,
        filters=filters,
        query=urlencode(words),
        following=urlencode({**words, "cursor": found.next}) if found.next else "",
        classes=[c.name for c in next(iter(schemes().values())).scheme.classes],
        rules=[c.rules for c in rule_sets().values()],
        sorts=list(listing.SORTS),
        today=today(),
    )


@router.get("/lasers/new")
def new_laser(request: Request, actor: Edit, database: Store) -> Response:
    """Save the setup of an address of the evaluation page."""
    query = request.url.query
    if not query:
        return see("/")
    setup = request_of_query(query)
    values = {"label": setup.label, "place": read_address(query).get("place")}
    return _save_page(request, actor, database, query, values)


def _save_page(
    request: Request,
    actor: Actor,
    database: Database,
    query: str,
    values: dict[str, str],
    problem: Problem | None = None,
) -> Response:
    setup = request_of_query(query)
    result = kept(setup)
    with database.read() as connection:
        named = Filters(q=setup.label[:200].replace("\n", " "), status="current")
        alike = page_of(connection, named, 10, None).items if setup.label else []
    return register_page(
        request,
        actor,
        "save.html",
        problem=problem,
        setup=query,
        values=values,
        figures=result.figures,
        alike=[a for a in alike if a.label == setup.label],
        evaluate=f"/evaluate?{query}",
    )


@router.post("/lasers/new")
def save_laser(request: Request, actor: Edit, database: Store, fields: FormFields) -> Response:
    """Store a setup as a new laser, or as a new revision of one that is there."""
    query = str(fields.pop("setup", ""))
    setup = request_of_query(query)
    chosen = str(fields.pop("revise", ""))
    values = {n: str(fields.get(n, "")) for n in (*IDENTITY, "reason")}
    try:
        if chosen.isdecimal():
            return _revise(request, actor, database, int(chosen), setup, values["reason"])
        body = parsed(LaserIn, {**values, "request": setup})
        result = kept(body.asked)
        with database.write() as connection:
            laser_id = lasers.create(connection, actor, body, result)
    except Problem as problem:
        return _save_page(request, actor, database, query, values, problem)
    return see(f"/lasers/{laser_id}", done="created")


def _revise(
    request: Request, actor: Actor, database: Database, laser_id: int, setup: Any, reason: str
) -> Response:
    """A new revision of a laser that keeps its identity."""
    with database.read() as connection:
        row = stored.laser_row(connection, laser_id)
    body = parsed(LaserIn, {**{n: row[n] for n in IDENTITY}, "reason": reason, "request": setup})
    result = kept(body.asked)
    with database.write() as connection:
        changed = lasers.update(connection, actor, laser_id, row["version"], body, result)
    return see(f"/lasers/{laser_id}", done="changed" if changed else "unchanged")


@router.get("/lasers/{laser_id:int}")
def laser_page(request: Request, actor: View, database: Store, laser_id: int) -> Response:
    """A laser: state, figures, sign-off, eyewear, history, audit."""
    return laser_page_with(
        request, actor, database, laser_id, DONE.get(request.query_params.get("done", ""), "")
    )


def laser_page_with(
    request: Request,
    actor: Actor,
    database: Database,
    laser_id: int,
    done: str = "",
    problem: Problem | None = None,
) -> Response:
    """The page of a laser, with what was done or why not."""
    with database.read() as connection:
        laser = stored.laser(connection, laser_id)
        history = stored.history(connection, laser_id)
        events = list(audit.listed(connection, subject="laser", subject_id=laser_id, limit=30))
    pairs = matching.pairs_for(database, laser_id) if laser.optical_density > 0 else []
    return register_page(
        request,
        actor,
        "laser.html",
        problem=problem,
        done=done,
        laser=laser,
        setup=request_from(json.dumps(laser.request)),
        history=history,
        events=events,
        pairs=pairs,
        evaluate=evaluate_address(request_from(json.dumps(laser.request))),
        today=today(),
    )


@router.post("/lasers/{laser_id:int}")
def laser_step(request: Request, actor: Edit, database: Store, laser_id: int, fields: FormFields) -> Response:
    """One step: submit, withdraw, retire, reinstate, evaluate anew, set the review."""
    step, version = str(fields.get("step", "")), posted_version(fields)
    note = {"comment": str(fields.get("comment", ""))}
    try:
        with database.write() as connection:
            number = stored.laser_row(connection, laser_id)["revision"]
            if step == "submit":
                flow.submit(connection, actor, laser_id, number, parsed(DecisionIn, note), version)
            elif step == "withdraw":
                flow.withdraw(connection, actor, laser_id, number, parsed(DecisionIn, note), version)
            elif step == "retire":
                flow.retire(connection, actor, laser_id, version)
            elif step == "reinstate":
                flow.reinstate(connection, actor, laser_id, version)
            elif step == "anew":
                reason = "evaluated anew under the tables in use"
                flow.evaluate_anew(connection, actor, laser_id, reason, version)
            elif step == "review":
                due = parsed(DecisionIn, {"review_due": str(fields.get("review_due", ""))}).review_due
                flow.review(connection, actor, laser_id, due, version)
            else:
                raise unknown_step(step)
    except Problem as problem:
        return laser_page_with(request, actor, database, laser_id, problem=problem)
    return see(f"/lasers/{laser_id}", done=step)


def unknown_step(step: str) -> InvalidRequest:
    """The problem of a button that no page has."""
    error = field_error("step", step, "a button of the page", "unknown step", "Use the buttons of the page.")
    return InvalidRequest("step: unknown step", [error])


def posted_version(fields: dict[str, Any]) -> int | None:
    """The version that the form was made for."""
    text = str(fields.get("version", ""))
    return int(text) if text.isascii() and text.isdecimal() and len(text) < 10 else None


@router.get("/lasers/{laser_id:int}/edit")
def edit_page(request: Request, actor: Edit, database: Store, laser_id: int) -> Response:
    """Change identity and request."""
    with database.read() as connection:
        laser = stored.laser(connection, laser_id)
    values = {n: getattr(laser, n) or "" for n in IDENTITY} | {"version": str(laser.version)}
    values["request"] = json.dumps(laser.request, indent=2, ensure_ascii=False)
    evaluate = evaluate_address(request_from(json.dumps(laser.request)))
    return register_page(request, actor, "edit.html", laser=laser, values=values, evaluate=evaluate)


@router.post("/lasers/{laser_id:int}/edit")
def edit_laser(request: Request, actor: Edit, database: Store, laser_id: int, fields: FormFields) -> Response:
    """Store a change of identity or request."""
    values = {n: str(fields.get(n, "")) for n in (*IDENTITY, "reason", "version", "request")}
    try:
        try:
            setup = json.loads(values["request"])
        except (ValueError, RecursionError):
            error = field_error("request", None, "JSON", "this is not JSON", "Correct the text.")
            raise InvalidRequest("request: this is not JSON", [error]) from None
        given = {n: values[n] for n in (*IDENTITY, "reason")}
        body = parsed(LaserIn, {**given, "request": setup})
        result = kept(body.asked)
        with database.write() as connection:
            changed = lasers.update(connection, actor, laser_id, posted_version(fields), body, result)
    except Problem as problem:
        with database.read() as connection:
            laser = stored.laser(connection, laser_id)
        return register_page(
            request, actor, "edit.html", problem=problem, laser=laser, values=values, evaluate=None
        )
    return see(f"/lasers/{laser_id}", done="changed" if changed else "unchanged")


@router.get("/lasers/{laser_id:int}/revisions/{number:int}")
def revision_page(request: Request, actor: View, database: Store, laser_id: int, number: int) -> Response:
    """One revision, beside an earlier one (`against`; by default the one before)."""
    text = request.query_params.get("against", str(number - 1))
    against = int(text) if text.isascii() and text.isdecimal() and len(text) < 9 else 0
    with database.read() as connection:
        laser = stored.laser(connection, laser_id)
        revision = stored.revision_document(connection, laser_id, number)
        earlier = stored.revision_document(connection, laser_id, against) if against > 0 else None
        numbers = [r.number for r in stored.history(connection, laser_id)]
    return register_page(
        request,
        actor,
        "revision.html",
        laser=laser,
        revision=revision,
        earlier=earlier,
        numbers=numbers,
        inputs=differences(earlier.request, revision.request) if earlier else [],
        figures=figures_differences(earlier.figures, revision.figures) if earlier else [],
        evaluate=evaluate_address(request_from(json.dumps(revision.request))),
        text=json.dumps(revision.request, indent=2, ensure_ascii=False),
    )


@router.post("/lasers/bulk")
def bulk_step(request: Request, actor: Edit, database: Store, fields: FormFields) -> Response:
    """One step for every laser selected; each is done or told why not."""
    ids = [int(k[5:]) for k in fields if k.startswith("pick-") and k[5:].isdecimal() and len(k) < 15]
    step = str(fields.get("step", ""))
    done: list[str] = []
    left: list[FieldError] = []
    for laser_id in ids:
        try:
            with database.write() as connection:
                row = stored.laser_row(connection, laser_id)
                if step == "submit":
                    flow.submit(connection, actor, laser_id, row["revision"], DecisionIn(), None)
                elif step == "retire":
                    flow.retire(connection, actor, laser_id, None)
                elif step == "review":
                    due = parsed(DecisionIn, {"review_due": str(fields.get("review_due", ""))}).review_due
                    flow.review(connection, actor, laser_id, due, None)
                else:
                    raise unknown_step(step)
            done.append(row["asset_tag"])
        except Problem as problem:
            left.append(field_error(f"laser {laser_id}", None, "", problem.detail, ""))
    return register_page(request, actor, "bulk.html", finished=done, left=left, step=step, empty=not ids)
