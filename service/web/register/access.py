"""Who asks, and whether they may.

Without sign-in the register answers this machine alone: a loopback peer, no proxy in between, a
loopback name in Host (so that no foreign page reaches it under another name). With sign-in it
answers sessions and API tokens; with a trusted header, what a named proxy says.
"""

from __future__ import annotations

import hashlib
import hmac
import secrets
from ipaddress import ip_address
from typing import Annotated, Any
from urllib.parse import quote

from fastapi import Depends
from starlette.requests import Request
from starlette.responses import Response

from service.register import accounts
from service.register.actor import Actor, Permission
from service.register.database import Database
from service.register.problems import Forbidden, SignInNeeded
from service.settings import Settings
from service.web.peers import over_tls, through_proxy
from service.web.problems import wants_page

__all__ = [
    "FORM_COOKIE",
    "SESSION_COOKIE",
    "Admin",
    "Approve",
    "Edit",
    "Guard",
    "Store",
    "View",
    "Visitor",
    "actor_of",
    "check_form",
    "check_site",
    "drop_cookie",
    "form_token",
    "set_cookie",
    "store_of",
]

SESSION_COOKIE, FORM_COOKIE = "blinkline_session", "blinkline_form"
LOOPBACK_NAMES = ("localhost", "127.0.0.1", "[::1]")
FORWARDED = ("forwarded", "x-forwarded-for", "x-forwarded-host", "x-real-ip")
BEARER = {"www-authenticate": "Bearer"}
SAFE = ("GET", "HEAD")
LOCAL_ONLY = (
    "sign-in is off, so the register answers only this machine, under the name localhost or 127.0.0.1. "
    "Set BLINKLINE_SIGN_IN=password to open it to others"
)


def store_of(request: Request) -> Database:
    """The register's database, its tables up to date. Raises RegisterUnavailable."""
    database: Database = request.app.state.register
    database.open()
    return database


def _is_local(request: Request) -> bool:
    try:
        loopback = request.client is not None and ip_address(request.client.host).is_loopback
    except ValueError:
        loopback = False
    host = request.headers.get("host", "")
    name = host.partition("]")[0] + "]" if host.startswith("[") else host.partition(":")[0]
    return loopback and name.lower() in LOOPBACK_NAMES and not any(h in request.headers for h in FORWARDED)


def actor_of(request: Request) -> Actor | None:
    """Who asks; None where nobody is signed in. Raises SignInNeeded for a token that does not hold."""
    settings: Settings = request.app.state.settings
    if settings.sign_in == "off":
        return Actor("local", "admin", "local") if _is_local(request) else None
    kind, _, secret = request.headers.get("authorization", "").partition(" ")
    if kind.lower() == "bearer":
        with store_of(request).read() as connection:
            found = accounts.actor_of_token(connection, secret.strip())
        if found is None:
            raise SignInNeeded(
                "this API token is unknown, revoked or expired", {"www-authenticate": "Bearer"}
            )
        return found
    if settings.sign_in == "header":
        names = request.headers.getlist(settings.user_header)
        if not through_proxy(request, settings) or len(names) != 1:
            return None
        with store_of(request).read() as connection:
            return accounts.actor_of_user(connection, names[0], "header")
    cookie = request.cookies.get(SESSION_COOKIE)
    if not cookie:
        return None
    with store_of(request).read() as connection:
        return accounts.actor_of_session(connection, cookie)


class Guard:
    """Lets in who has a permission: a dependency of every route of the register.

    Raises SignInNeeded, Forbidden; a page leads to the sign-in.
    """

    def __init__(self, permission: Permission) -> None:
        self.permission = permission

    def __call__(self, request: Request) -> Actor:
        """Who acts."""
        settings: Settings = request.app.state.settings
        actor = actor_of(request)
        if actor is None:
            if settings.sign_in == "off":
                raise Forbidden(LOCAL_ONLY)
            if settings.sign_in == "password" and wants_page(request) and request.method in SAFE:
                raise _GoSignIn(request)
            raise SignInNeeded("sign in, or send an API token", BEARER)
        if not actor.may(self.permission):
            raise Forbidden(f"this needs the permission to {self.permission}; your role is {actor.role}")
        if request.method not in SAFE and actor.via != "token":
            check_site(request)
        return actor


class _GoSignIn(SignInNeeded):
    """Leads to the sign-in page, and back afterwards."""

    status = 303

    def __init__(self, request: Request) -> None:
        address = request.url.path + (f"?{request.url.query}" if request.url.query else "")
        super().__init__("sign in", {"location": f"/sign-in?next={quote(address, safe='')}"})


def check_site(request: Request) -> None:
    """Raises Forbidden where a browser says that a foreign page sent this."""
    if request.headers.get("sec-fetch-site", "same-origin") not in ("same-origin", "none"):
        raise Forbidden("this came from a page of another site")


def form_token(request: Request) -> tuple[str, str | None]:
    """The token that forms carry, and the value of a new form cookie where there is none yet."""
    secret = request.cookies.get(SESSION_COOKIE) or request.cookies.get(FORM_COOKIE)
    fresh = None if secret else secrets.token_urlsafe(24)
    return _token(secret or fresh or ""), fresh


def check_form(request: Request, fields: dict[str, Any]) -> None:
    """Raises Forbidden where a form does not carry the token of its cookie."""
    secret = request.cookies.get(SESSION_COOKIE) or request.cookies.get(FORM_COOKIE)
    given = fields.pop("csrf", "")
    if not secret or not isinstance(given, str) or not hmac.compare_digest(given, _token(secret)):
        raise Forbidden("the form is too old or not ours; open it anew and send it again")


def _token(secret: str) -> str:
    return hmac.new(secret.encode(), b"form", hashlib.sha256).hexdigest()


def set_cookie(request: Request, response: Response, name: str, value: str, seconds: float | None) -> None:
    """A cookie that no script reads and that only this site gets."""
    response.set_cookie(
        name,
        value,
        max_age=None if seconds is None else int(seconds),
        httponly=True,
        samesite="lax" if name == SESSION_COOKIE else "strict",
        secure=over_tls(request, request.app.state.settings),
        path="/",
    )


def drop_cookie(request: Request, response: Response, name: str) -> None:
    """Take a cookie back."""
    response.delete_cookie(
        name, path="/", httponly=True, secure=over_tls(request, request.app.state.settings), samesite="lax"
    )


View = Annotated[Actor, Depends(Guard("view"))]
Edit = Annotated[Actor, Depends(Guard("edit"))]
Approve = Annotated[Actor, Depends(Guard("approve"))]
Admin = Annotated[Actor, Depends(Guard("admin"))]
Visitor = Annotated[Actor | None, Depends(actor_of)]
Store = Annotated[Database, Depends(store_of)]
