"""Pages of the register: who is signed in, the token of forms, the menu."""

from __future__ import annotations

from typing import Any
from urllib.parse import quote, urlencode

from starlette.requests import Request
from starlette.responses import RedirectResponse, Response

from service.contract.answer import cautions
from service.contract.problem import Problem
from service.register.actor import Actor
from service.register.difference import Change
from service.web.numbers import plain
from service.web.register.access import FORM_COOKIE, form_token, set_cookie
from service.web.templates import environment, page

__all__ = ["change_text", "moment", "register_page", "see", "value_text"]

#: Pages of the menu: address, name, permission.
MENU = (
    ("/lasers", "Lasers", "view"),
    ("/overview", "Overview", "view"),
    ("/shelf", "Eyewear shelf", "view"),
    ("/reevaluations", "Re-evaluation", "view"),
    ("/audit", "Audit log", "admin"),
    ("/users", "Users", "admin"),
)


def register_page(
    request: Request,
    actor: Actor | None,
    template: str,
    *,
    status: int = 200,
    problem: Problem | None = None,
    **values: Any,
) -> Response:
    """A page of the register; `problem` says on top why something was not done."""
    token, fresh = form_token(request)
    mode = request.app.state.settings.sign_in
    response = page(
        request,
        f"register/{template}",
        status=problem.status if problem else status,
        actor=actor,
        csrf=token,
        menu=[(a, n) for a, n, p in MENU if actor and actor.may(p)],  # type: ignore[arg-type]
        sign_in=mode,
        problem=problem,
        **{"cautions": cautions(), "result": None, **values},
    )
    if fresh:
        set_cookie(request, response, FORM_COOKIE, fresh, None)
    return response


def see(address: str, **parameters: str) -> Response:
    """Lead to a page after something was done."""
    query = f"?{urlencode(parameters, quote_via=quote)}" if parameters else ""
    return RedirectResponse(address + query, 303)


def moment(text: str) -> str:
    """A time to the minute: 2026-05-04 09:30 UTC."""
    return f"{text[:10]} {text[11:16]} UTC"


def value_text(value: Any) -> str:
    """A value of a document in words."""
    if value is None:
        return "not given"
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return plain(value)
    if isinstance(value, list):
        return ", ".join(value_text(v) for v in value) or "none"
    if isinstance(value, dict):
        return ", ".join(f"{k}: {value_text(v)}" for k, v in value.items()) or "none"
    return str(value)


def change_text(change: Change) -> str:
    """The name of a changed field for people: line 1 emission power_w."""
    parts: list[str] = []
    for part in change.field.split("."):
        if part.isdigit() and parts and parts[-1] in ("lines", "bench", "eyewear", "windows", "ranges"):
            name = {"lines": "line", "bench": "element", "eyewear": "pair", "windows": "window"}
            parts[-1] = f"{name.get(parts[-1], 'range')} {int(part) + 1}"
        else:
            parts.append(part)
    return " ".join(parts)


environment().filters.update(moment=moment, value_text=value_text, change_text=change_text)
