"""Pages of sign-in, one's account, users and the audit log."""

from __future__ import annotations

from typing import Any

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response, StreamingResponse

from service.contract.problem import InvalidRequest, NotFound, Problem
from service.register import accounts, audit
from service.register.accounts import SESSION_S, TokenIn, UserIn
from service.register.actor import ROLES, SCOPES, Actor
from service.register.database import Database
from service.register.problems import RegisterProblem, SignInNeeded, field_error
from service.web.peers import peer_of
from service.web.register.access import (
    SESSION_COOKIE,
    Admin,
    Store,
    View,
    Visitor,
    check_site,
    drop_cookie,
    set_cookie,
)
from service.web.register.api_admin import UserChange, export_audit
from service.web.register.bodies import FormFields, parsed
from service.web.register.render import register_page, see

__all__ = ["router"]

router = APIRouter(include_in_schema=False)
ON_PAGE = 100


def _next(text: str) -> str:
    """A page of this service to go on with, and no other."""
    ours = text.startswith("/") and not text.startswith(("//", "/\\")) and text.isprintable()
    return text if ours else "/lasers"


def _by_password(request: Request) -> None:
    if request.app.state.settings.sign_in != "password":
        raise NotFound("there is no sign-in by password here")


@router.get("/sign-in")
def sign_in_page(request: Request, actor: Visitor, database: Store) -> Response:
    """Name and password."""
    _by_password(request)
    if actor is not None:
        return see(_next(request.query_params.get("next", "")))
    return _sign_in_page(request, database, request.query_params.get("next", ""))


def _sign_in_page(
    request: Request, database: Database, following: str, name: str = "", problem: Problem | None = None
) -> Response:
    with database.read() as connection:
        nobody = not accounts.users_list(connection)
    return register_page(
        request,
        None,
        "sign_in.html",
        problem=problem,
        following=_next(following),
        typed=name,
        nobody=nobody,
    )


@router.post("/sign-in")
def sign_in(request: Request, database: Store, fields: FormFields) -> Response:
    """Open a session, or tell that name or password is wrong; both slowly after many failures."""
    _by_password(request)
    check_site(request)
    name, password = str(fields.get("name", "")).strip()[:100], str(fields.get("password", ""))
    following = str(fields.get("next", ""))
    if not name.isprintable():
        name = ""
    keys = [f"name:{name.lower()}"[:200], f"peer:{peer_of(request, request.app.state.settings)}"[:200]]
    try:
        with database.read() as connection:
            accounts.delay(connection, keys)
            actor = accounts.actor_of_user(connection, name, "session", password)
        with database.write() as connection:
            accounts.failed(connection, keys, actor is not None)
            secret = accounts.open_session(connection, actor) if actor else ""
        if not secret:
            raise SignInNeeded("name or password is wrong")
    except RegisterProblem as problem:
        response = _sign_in_page(request, database, following, name, problem)
        response.headers.update(problem.headers)
        return response
    response = see(_next(following))
    set_cookie(request, response, SESSION_COOKIE, secret, SESSION_S)
    return response


@router.post("/sign-out")
def sign_out(request: Request, actor: View, database: Store, fields: FormFields) -> Response:
    """End the session."""
    with database.write() as connection:
        accounts.close_session(connection, request.cookies.get(SESSION_COOKIE, ""))
    response = see("/")
    drop_cookie(request, response, SESSION_COOKIE)
    return response


@router.get("/account")
def account_page(request: Request, actor: View, database: Store) -> Response:
    """One's name, role, password and tokens."""
    return _account_page(request, actor, database)


def _account_page(
    request: Request,
    actor: Actor,
    database: Database,
    problem: Problem | None = None,
    secret: str = "",
) -> Response:
    with database.read() as connection:
        tokens = accounts.tokens_of(connection, actor.user_id)
    return register_page(
        request,
        actor,
        "account.html",
        problem=problem,
        tokens=tokens,
        secret=secret,
        scopes=[s for s, p in SCOPES.items() if actor.may(p)],
    )


@router.post("/account")
def account_step(request: Request, actor: View, database: Store, fields: FormFields) -> Response:
    """A new password, a new token, a revoked token."""
    step, secret = str(fields.get("step", "")), ""
    given = {k: str(v) for k, v in fields.items()}
    try:
        with database.write() as connection:
            if step == "password":
                _change_password(connection, actor, given)
            elif step == "token":
                days = given.get("days", "")
                body: dict[str, Any] = {"name": given.get("name", ""), "scope": given.get("scope", "")}
                body["days"] = int(days) if days.isascii() and days.isdecimal() and len(days) < 6 else None
                _, secret = accounts.make_token(connection, actor, parsed(TokenIn, body))
            elif step.startswith("revoke-") and step[7:].isdecimal() and len(step) < 17:
                accounts.revoke_token(connection, actor, int(step[7:]))
            else:
                raise NotFound("there is no such step")
    except Problem as problem:
        return _account_page(request, actor, database, problem)
    if step == "password":
        return see("/sign-in")
    return _account_page(request, actor, database, secret=secret)


def _change_password(connection: Any, actor: Actor, given: dict[str, str]) -> None:
    if actor.user_id is None or not accounts.actor_of_user(
        connection, actor.name, actor.via, given.get("old", "")
    ):
        error = field_error("old", None, "your password", "the old password is wrong", "Type it again.")
        raise InvalidRequest("old: the old password is wrong", [error])
    accounts.set_password(connection, actor, actor.user_id, given.get("new", ""))


@router.get("/users")
def users_page(request: Request, actor: Admin, database: Store) -> Response:
    """Users and roles."""
    return _users_page(request, actor, database)


def _users_page(
    request: Request, actor: Actor, database: Database, problem: Problem | None = None
) -> Response:
    with database.read() as connection:
        users = accounts.users_list(connection)
    return register_page(request, actor, "users.html", problem=problem, users=users, roles=ROLES)


@router.post("/users")
def users_step(request: Request, actor: Admin, database: Store, fields: FormFields) -> Response:
    """Add a user, or change one."""
    given = {k: str(v) for k, v in fields.items()}
    chosen = given.get("user", "")
    try:
        with database.write() as connection:
            if not chosen:
                body = {"name": given.get("name", ""), "role": given.get("role", "")}
                password = given.get("password") or None
                accounts.add_user(connection, actor, parsed(UserIn, {**body, "password": password}))
            elif chosen.isdecimal() and len(chosen) < 10:
                change = parsed(
                    UserChange, {"role": given.get("role", ""), "active": given.get("active") == "yes"}
                )
                accounts.change_user(connection, actor, int(chosen), change.role, change.active)
                if given.get("password"):
                    accounts.set_password(connection, actor, int(chosen), given["password"])
    except Problem as problem:
        return _users_page(request, actor, database, problem)
    return see("/users")


@router.get("/audit")
def audit_page(request: Request, actor: Admin, database: Store) -> Response:
    """Every change, the newest first."""
    text = request.query_params.get("before", "")
    before = int(text) if text.isascii() and text.isdecimal() and len(text) < 10 else None
    with database.read() as connection:
        found = list(audit.listed(connection, before=before, limit=ON_PAGE + 1))
    more = found[ON_PAGE - 1].id if len(found) > ON_PAGE else None
    return register_page(request, actor, "audit.html", events=found[:ON_PAGE], following=more)


@router.get("/audit.ndjson")
def audit_file(actor: Admin, database: Store) -> Response:
    """The whole audit log as JSON lines."""
    response = export_audit(actor, database)
    assert isinstance(response, StreamingResponse)
    return response
