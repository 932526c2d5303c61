"""The audit log, users and API tokens as JSON."""

from __future__ import annotations

from collections.abc import Iterator

from fastapi import APIRouter
from pydantic import Field
from starlette.requests import Request
from starlette.responses import Response, StreamingResponse

from service.contract.result import Model
from service.contract.strict import Strict
from service.register import accounts, audit
from service.register.accounts import TokenIn, TokenInfo, User, UserIn
from service.register.actor import Role
from service.register.models import Event
from service.web.register.access import Admin, Store, View
from service.web.register.bodies import JsonBody, number_of, parsed, queried, schema_parameters

__all__ = ["UserChange", "router"]

router = APIRouter(prefix="/api/v1", tags=["register"])
JSON = "application/json"
PAGE = (
    ("limit", "Entries on a page, 1 to 500; 50 by default."),
    ("cursor", "The field next of the page before."),
)


class Me(Model):
    """Who acts."""

    name: str
    role: Role
    via: str


class EventPage(Model):
    """One page of the audit log; `next` is the cursor of the following page."""

    items: list[Event]
    next: str | None


class NewToken(TokenInfo):
    """A new token with its secret, which is shown this once."""

    secret: str


class UserChange(Strict):
    """What changes of a user; null = stays."""

    role: Role | None = None
    active: bool | None = None
    password: str | None = Field(None, max_length=200)


def _json(text: str, status: int = 200) -> Response:
    return Response(text, status, media_type=JSON, headers={"cache-control": "no-store"})


@router.get("/me", response_model=Me, summary="Who acts")
def get_me(actor: View) -> Response:
    """Name and role of the session, the token or the header."""
    return _json(Me(name=actor.name, role=actor.role, via=actor.via).model_dump_json())


@router.get(
    "/audit",
    response_model=EventPage,
    summary="The audit log, the newest first",
    openapi_extra=schema_parameters(Strict, *PAGE),
)
def get_audit(request: Request, actor: Admin, database: Store) -> Response:
    """Every change, with who, when, what, from and to."""
    _, beside = queried(Strict, request, "limit", "cursor")
    limit = number_of(beside, "limit", 50, 1, 500)
    before = number_of(beside, "cursor", 2**31 - 1, 1, 2**31 - 1)
    with database.read() as connection:
        found = list(audit.listed(connection, before=before, limit=limit + 1))
    items = found[:limit]
    more = str(items[-1].id) if len(found) > limit else None
    return _json(EventPage(items=items, next=more).model_dump_json())


@router.get("/audit/export", summary="The whole audit log as JSON lines")
def export_audit(actor: Admin, database: Store) -> Response:
    """One entry a line, the newest first; keep it beside backups to prove that none is missing."""

    def lines() -> Iterator[str]:
        with database.read() as connection:
            for event in audit.listed(connection):
                yield event.model_dump_json() + "\n"

    headers = {"content-disposition": 'attachment; filename="audit.ndjson"', "cache-control": "no-store"}
    return StreamingResponse(lines(), media_type="application/x-ndjson", headers=headers)


@router.get("/users", response_model=list[User], summary="Users and their roles")
def get_users(actor: Admin, database: Store) -> Response:
    """Every user, without secrets."""
    with database.read() as connection:
        found = accounts.users_list(connection)
    return _json(f"[{','.join(u.model_dump_json() for u in found)}]")


@router.post("/users", status_code=201, response_model=list[User], summary="Add a user")
def post_user(actor: Admin, database: Store, data: JsonBody) -> Response:
    """Answers the list of users."""
    body = parsed(UserIn, data)
    with database.write() as connection:
        accounts.add_user(connection, actor, body)
        found = accounts.users_list(connection)
    return _json(f"[{','.join(u.model_dump_json() for u in found)}]", 201)


@router.put("/users/{user_id:int}", response_model=list[User], summary="Change role, activity, password")
def put_user(actor: Admin, database: Store, data: JsonBody, user_id: int) -> Response:
    """Ends the open sessions of the user. Answers the list of users."""
    body = parsed(UserChange, data)
    with database.write() as connection:
        accounts.change_user(connection, actor, user_id, body.role, body.active)
        if body.password is not None:
            accounts.set_password(connection, actor, user_id, body.password)
        found = accounts.users_list(connection)
    return _json(f"[{','.join(u.model_dump_json() for u in found)}]")


@router.get("/tokens", response_model=list[TokenInfo], summary="Your API tokens")
def get_tokens(actor: View, database: Store) -> Response:
    """Names, scopes and dates, without secrets."""
    with database.read() as connection:
        found = accounts.tokens_of(connection, actor.user_id)
    return _json(f"[{','.join(t.model_dump_json() for t in found)}]")


@router.post("/tokens", status_code=201, response_model=NewToken, summary="Make an API token of your own")
def post_token(actor: View, database: Store, data: JsonBody) -> Response:
    """The secret is in this answer and nowhere else. A token makes no tokens of wider scope."""
    body = parsed(TokenIn, data)
    with database.write() as connection:
        token_id, secret = accounts.make_token(connection, actor, body)
        info = next(t for t in accounts.tokens_of(connection, actor.user_id) if t.id == token_id)
    return _json(NewToken(**info.model_dump(), secret=secret).model_dump_json(), 201)


@router.delete("/tokens/{token_id:int}", response_model=list[TokenInfo], summary="Revoke an API token")
def delete_token(actor: View, database: Store, token_id: int) -> Response:
    """Your own, or anybody's as admin. Answers the list of your tokens."""
    with database.write() as connection:
        accounts.revoke_token(connection, actor, token_id)
        found = accounts.tokens_of(connection, actor.user_id)
    return _json(f"[{','.join(t.model_dump_json() for t in found)}]")
