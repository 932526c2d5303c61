"""Pages of the eyewear shelf, the overview and re-evaluation."""

from __future__ import annotations

from typing import Any

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response

from service.contract.classification import schemes
from service.contract.problem import FieldError, InvalidRequest, Problem
from service.register import listing, matching, reevaluate, shelf
from service.register.actor import Actor
from service.register.models import EyewearIn
from service.register.problems import field_error
from service.web.filled import ranges_text
from service.web.numbers import NotANumber, parse_number, plain
from service.web.register.access import Edit, Store, View
from service.web.register.bodies import FormFields, parsed
from service.web.register.pages_lasers import posted_version
from service.web.register.render import register_page, see
from service.web.shelf import BadRanges, parse_ranges

__all__ = ["router"]

router = APIRouter(include_in_schema=False)
BLANK = {"tag": "", "name": "", "ranges": "", "light_percent": "", "quantity": "1", "place": ""}
FIELDS = (*BLANK, "inspection_due", "retired", "version")


def _eyewear(values: dict[str, str]) -> EyewearIn:
    """The pair of a form. Raises InvalidRequest with the fields of the form."""
    errors: list[FieldError] = []
    pair: dict[str, Any] = {"name": values["name"], "ranges": []}
    try:
        pair["ranges"] = parse_ranges(values["ranges"])
    except BadRanges as error:
        allowed = "ranges, for example 780-1100: OD 7 | D LB6 + IR LB7"
        errors.append(field_error("ranges", values["ranges"], allowed, str(error), "Write it as shown."))
    if values["light_percent"]:
        try:
            pair["luminous_transmittance"] = parse_number(values["light_percent"]) / 100.0
        except NotANumber as error:
            text = values["light_percent"]
            errors.append(field_error("light_percent", text, "above 0 to 100 %", str(error), error.remedy))
    if not (values["quantity"].isascii() and values["quantity"].isdecimal()):
        text = values["quantity"]
        errors.append(field_error("quantity", text, "0 to 100000", "not a whole number", "Count the pairs."))
    if errors:
        raise InvalidRequest(f"{errors[0].field}: {errors[0].message}", errors)
    return parsed(
        EyewearIn,
        {
            "tag": values["tag"],
            "pair": pair,
            "quantity": int(values["quantity"][:9]),
            "place": values["place"],
            "inspection_due": values["inspection_due"],
            "retired": values["retired"] == "yes",
        },
    )


def _given(fields: dict[str, Any]) -> dict[str, str]:
    return {n: str(fields.get(n, "")).strip() for n in FIELDS}


@router.get("/shelf")
def shelf_page(request: Request, actor: View, database: Store) -> Response:
    """Every pair with markings, place and inspection."""
    with database.read() as connection:
        rows = shelf.shelf_list(connection)
    found = [(shelf.record_of(r), ranges_text(shelf.record_of(r).pair["ranges"])) for r in rows]
    return register_page(request, actor, "shelf.html", pairs=found)


@router.get("/shelf/new")
def new_pair(request: Request, actor: Edit) -> Response:
    """A blank pair."""
    values = {**BLANK, "inspection_due": "", "retired": "", "version": ""}
    return register_page(request, actor, "pair.html", pair=None, values=values, lasers=[], left=0, done="")


@router.post("/shelf/new")
def add_pair(request: Request, actor: Edit, database: Store, fields: FormFields) -> Response:
    """Put a pair on the shelf."""
    values = _given(fields)
    try:
        body = _eyewear(values)
        with database.write() as connection:
            eyewear_id = shelf.add(connection, actor, body)
    except Problem as problem:
        return register_page(
            request,
            actor,
            "pair.html",
            problem=problem,
            pair=None,
            values=values,
            lasers=[],
            left=0,
            done="",
        )
    return see(f"/shelf/{eyewear_id}", done="added")


@router.get("/shelf/{eyewear_id:int}")
def pair_page(request: Request, actor: View, database: Store, eyewear_id: int) -> Response:
    """A pair, and which lasers it covers."""
    done = {"added": "Put on the shelf.", "changed": "The change is stored."}
    return _pair_page(
        request, actor, database, eyewear_id, done.get(request.query_params.get("done", ""), "")
    )


def _pair_page(
    request: Request,
    actor: Actor,
    database: Any,
    eyewear_id: int,
    done: str = "",
    problem: Problem | None = None,
    values: dict[str, str] | None = None,
) -> Response:
    with database.read() as connection:
        pair = shelf.record_of(shelf.shelf_row(connection, eyewear_id))
    light = pair.pair.get("luminous_transmittance")
    values = values or {
        "tag": pair.tag,
        "name": pair.pair["name"],
        "ranges": ranges_text(pair.pair["ranges"]),
        "light_percent": "" if light is None else plain(float(f"{light * 100.0:.10g}")),
        "quantity": str(pair.quantity),
        "place": pair.place,
        "inspection_due": pair.inspection_due or "",
        "retired": "yes" if pair.retired else "",
        "version": str(pair.version),
    }
    in_use = not pair.retired and pair.quantity > 0
    found, left = matching.lasers_for(database, eyewear_id) if in_use else ([], 0)
    return register_page(
        request,
        actor,
        "pair.html",
        problem=problem,
        pair=pair,
        values=values,
        lasers=found,
        left=left,
        done=done,
    )


@router.post("/shelf/{eyewear_id:int}")
def change_pair(
    request: Request, actor: Edit, database: Store, eyewear_id: int, fields: FormFields
) -> Response:
    """Store a change of a pair."""
    values = _given(fields)
    try:
        body = _eyewear(values)
        with database.write() as connection:
            shelf.change(connection, actor, eyewear_id, posted_version(fields), body)
    except Problem as problem:
        return _pair_page(request, actor, database, eyewear_id, problem=problem, values=values)
    return see(f"/shelf/{eyewear_id}", done="changed")


@router.get("/overview")
def overview_page(request: Request, actor: View, database: Store) -> Response:
    """By class, overdue, without suitable eyewear, with other tables."""
    with database.read() as connection:
        counts = listing.overview(connection)
        overdue = listing.page_of(connection, listing.Filters(overdue=True, sort="review"), 10, None)
        waiting = listing.page_of(connection, listing.Filters(status="submitted"), 10, None)
    return register_page(
        request,
        actor,
        "overview.html",
        counts=counts,
        overdue=overdue,
        waiting=waiting,
        classes=[c.name for c in next(iter(schemes().values())).scheme.classes],
        cover=matching.without_eyewear(database),
    )


@router.get("/reevaluations")
def runs_page(request: Request, actor: View, database: Store) -> Response:
    """Passes over the register, and how many lasers rest on other tables."""
    with database.read() as connection:
        found, counts = reevaluate.runs(connection), listing.overview(connection)
    return register_page(request, actor, "runs.html", runs=found, counts=counts)


@router.post("/reevaluations")
def start_run(request: Request, actor: Edit, database: Store, fields: FormFields) -> Response:
    """Start a pass."""
    try:
        run_id = reevaluate.start(database, actor)
    except Problem as problem:
        with database.read() as connection:
            found, counts = reevaluate.runs(connection), listing.overview(connection)
        return register_page(request, actor, "runs.html", problem=problem, runs=found, counts=counts)
    return see(f"/reevaluations/{run_id}")


@router.get("/reevaluations/{run_id:int}")
def run_page(request: Request, actor: View, database: Store, run_id: int) -> Response:
    """Progress, and what would change, old beside new."""
    with database.read() as connection:
        run = reevaluate.run_of(connection, run_id)
        changes = reevaluate.changes_of(connection, run_id)
    return register_page(request, actor, "run.html", run=run, changes=changes, adopted=None, left=[])


@router.post("/reevaluations/{run_id:int}")
def adopt_run(request: Request, actor: Edit, database: Store, run_id: int, fields: FormFields) -> Response:
    """Adopt what is selected."""
    ids = [int(k[5:]) for k in fields if k.startswith("pick-") and k[5:].isdecimal() and len(k) < 15]
    problem, adopted, left = None, None, list[str]()
    try:
        with database.write() as connection:
            adopted, left = reevaluate.adopt(connection, actor, run_id, ids)
    except Problem as error:
        problem = error
    with database.read() as connection:
        run = reevaluate.run_of(connection, run_id)
        changes = reevaluate.changes_of(connection, run_id)
    return register_page(
        request, actor, "run.html", problem=problem, run=run, changes=changes, adopted=adopted, left=left
    )
