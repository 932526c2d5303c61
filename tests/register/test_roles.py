"""Every route of the application, every role and nobody: who gets in. No route may be forgotten here."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

import httpx
import pytest

from service.register import accounts
from service.register.accounts import TokenIn, UserIn
from service.register.actor import ROLES, SCOPES, Actor
from tests.register.web import HTML, Web, laser

ADMIN = Actor("setup", "admin", "command")
PASSWORD = "correct horse battery"
#: Routes that answer everybody: they store nothing.
OPEN = {
    ("GET", "/"),
    ("GET", "/api/v1/gain-media"),
    ("GET", "/before-first-light"),
    ("GET", "/gain-media"),
    ("GET", "/measured"),
    ("GET", "/partial-source"),
    ("GET", "/profile"),
    ("GET", "/tolerance"),
    ("POST", "/api/v1/bounds"),
    ("POST", "/api/v1/measured"),
    ("POST", "/api/v1/partial-source"),
    ("POST", "/api/v1/profile"),
    ("POST", "/api/v1/tolerance"),
    ("GET", "/api/v1/changes"),
    ("GET", "/api/v1/checks"),
    ("GET", "/api/v1/differences"),
    ("GET", "/changes"),
    ("GET", "/checks"),
    ("GET", "/differences"),
    ("GET", "/guide"),
    ("GET", "/guide/{topic}"),
    ("GET", "/api/v1/classes"),
    ("GET", "/api/v1/classes/{scheme_id}"),
    ("GET", "/api/v1/materials"),
    ("GET", "/api/v1/openapi.json"),
    ("GET", "/api/v1/rules"),
    ("GET", "/api/v1/rules/{rules_id}"),
    ("GET", "/classes"),
    ("GET", "/classes/{scheme_id}"),
    ("GET", "/evaluate"),
    ("GET", "/evaluate.csv"),
    ("GET", "/evaluate.json"),
    ("GET", "/eyewear"),
    ("GET", "/favicon.ico"),
    ("GET", "/health/live"),
    ("GET", "/health/ready"),
    ("GET", "/live"),
    ("GET", "/metrics"),
    ("GET", "/problems/{slug}"),
    ("GET", "/report"),
    ("GET", "/rules"),
    ("GET", "/rules/{rules_id}"),
    ("GET", "/sign"),
    ("GET", "/sign-in"),
    ("GET", "/sign/print"),
    ("GET", "/sign/sheet.{form_name}"),
    ("GET", "/static/{name}"),
    ("GET", "/sweep"),
    ("GET", "/sweep.csv"),
    ("POST", "/api/v1/compare"),
    ("POST", "/api/v1/evaluate"),
    ("POST", "/api/v1/evaluate/bulk"),
    ("POST", "/api/v1/report"),
    ("POST", "/api/v1/sign"),
    ("POST", "/api/v1/sweep"),
    ("POST", "/partial-source"),
    ("POST", "/profile"),
    ("POST", "/sign-in"),
}
#: The least role of every other route.
LEAST = {
    "viewer": {
        ("DELETE", "/api/v1/tokens/{token_id}"),
        ("GET", "/account"),
        ("GET", "/api/v1/eyewear"),
        ("GET", "/api/v1/eyewear/{eyewear_id}"),
        ("GET", "/api/v1/eyewear/{eyewear_id}/lasers"),
        ("GET", "/api/v1/lasers"),
        ("GET", "/api/v1/lasers/columns"),
        ("GET", "/api/v1/lasers/export"),
        ("GET", "/api/v1/lasers/{laser_id}"),
        ("GET", "/api/v1/lasers/{laser_id}/difference/{old}/{new}"),
        ("GET", "/api/v1/lasers/{laser_id}/evaluation"),
        ("GET", "/api/v1/lasers/{laser_id}/eyewear"),
        ("GET", "/api/v1/lasers/{laser_id}/report"),
        ("GET", "/api/v1/lasers/{laser_id}/revisions"),
        ("GET", "/api/v1/lasers/{laser_id}/revisions/{number}"),
        ("GET", "/api/v1/lasers/{laser_id}/sign"),
        ("GET", "/api/v1/me"),
        ("GET", "/api/v1/overview"),
        ("GET", "/api/v1/reevaluations"),
        ("GET", "/api/v1/reevaluations/{run_id}"),
        ("GET", "/api/v1/reevaluations/{run_id}/changes"),
        ("GET", "/api/v1/tokens"),
        ("GET", "/lasers"),
        ("GET", "/lasers.csv"),
        ("GET", "/lasers/{laser_id}"),
        ("GET", "/lasers/{laser_id}/report"),
        ("GET", "/lasers/{laser_id}/revisions/{number}"),
        ("GET", "/lasers/{laser_id}/sign"),
        ("GET", "/lasers/{laser_id}/sign/look"),
        ("GET", "/overview"),
        ("GET", "/reevaluations"),
        ("GET", "/reevaluations/{run_id}"),
        ("GET", "/shelf"),
        ("GET", "/shelf/{eyewear_id}"),
        ("POST", "/account"),
        ("POST", "/api/v1/tokens"),
        ("POST", "/sign-out"),
    },
    "editor": {
        ("DELETE", "/api/v1/lasers/{laser_id}"),
        ("GET", "/lasers/import"),
        ("GET", "/lasers/new"),
        ("GET", "/lasers/{laser_id}/edit"),
        ("GET", "/shelf/new"),
        ("POST", "/api/v1/eyewear"),
        ("POST", "/api/v1/lasers"),
        ("POST", "/api/v1/lasers/import"),
        ("POST", "/api/v1/lasers/{laser_id}/evaluate-anew"),
        ("POST", "/api/v1/lasers/{laser_id}/reinstate"),
        ("POST", "/api/v1/lasers/{laser_id}/revisions/{number}/submit"),
        ("POST", "/api/v1/lasers/{laser_id}/revisions/{number}/withdraw"),
        ("POST", "/api/v1/reevaluations"),
        ("POST", "/api/v1/reevaluations/{run_id}/adopt"),
        ("POST", "/lasers/bulk"),
        ("POST", "/lasers/import"),
        ("POST", "/lasers/new"),
        ("POST", "/lasers/{laser_id}"),
        ("POST", "/lasers/{laser_id}/edit"),
        ("POST", "/reevaluations"),
        ("POST", "/reevaluations/{run_id}"),
        ("POST", "/shelf/new"),
        ("POST", "/shelf/{eyewear_id}"),
        ("PUT", "/api/v1/eyewear/{eyewear_id}"),
        ("PUT", "/api/v1/lasers/{laser_id}"),
        ("PUT", "/api/v1/lasers/{laser_id}/review"),
    },
    "approver": {
        ("POST", "/api/v1/lasers/{laser_id}/revisions/{number}/approve"),
        ("POST", "/api/v1/lasers/{laser_id}/revisions/{number}/return"),
        ("POST", "/lasers/{laser_id}/revisions/{number}"),
    },
    "admin": {
        ("GET", "/api/v1/audit"),
        ("GET", "/api/v1/audit/export"),
        ("GET", "/api/v1/users"),
        ("GET", "/audit"),
        ("GET", "/audit.ndjson"),
        ("GET", "/users"),
        ("POST", "/api/v1/users"),
        ("POST", "/users"),
        ("PUT", "/api/v1/users/{user_id}"),
    },
}


@dataclass
class Campus:
    """A register with sign-in and one user and one token of every kind."""

    web: Web
    people: dict[str, httpx.AsyncClient]
    tokens: dict[str, str]


@pytest.fixture(scope="module")
def campus(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Campus]:
    folder = tmp_path_factory.mktemp("campus")
    web = Web(f"sqlite:///{folder}/register.sqlite3", base="https://register.test", sign_in="password")
    database = web.app.state.register
    database.open()
    tokens: dict[str, str] = {}
    people: dict[str, httpx.AsyncClient] = {}
    with database.write() as connection:
        for role in ROLES:
            body = UserIn(name=role, role=role, password=PASSWORD)
            accounts.add_user(connection, ADMIN, body)
            actor = accounts.actor_of_user(connection, role, "session")
            assert actor is not None
            people[role] = web.visitor()
            people[role].cookies.set("blinkline_session", accounts.open_session(connection, actor))
        admin = accounts.actor_of_user(connection, "admin", "session")
        assert admin is not None
        for scope in SCOPES:
            _, tokens[scope] = accounts.make_token(connection, admin, TokenIn(name=scope, scope=scope))
    people["nobody"] = web.visitor()
    yield Campus(web, people, tokens)
    web.close()


def routes(web: Web) -> set[tuple[str, str]]:
    """Every route as the OpenAPI document or the routers know it."""
    found = set()

    def walk(items: list[object]) -> None:
        for item in items:
            inner = getattr(item, "original_router", None)
            if inner is not None:
                walk(inner.routes)
                continue
            path = re.sub(r":\w+}", "}", item.path)  # type: ignore[attr-defined]
            found.update((m, path) for m in item.methods - {"HEAD"})  # type: ignore[attr-defined]

    walk(web.app.routes)
    return found


def address(path: str) -> str:
    """An address of a route; no such record exists."""
    return re.sub(r"\{\w+\}", "987", path)


def test_no_route_is_forgotten(campus: Campus) -> None:
    named = [r for group in (OPEN, *LEAST.values()) for r in group]
    assert len(named) == len(set(named))
    assert routes(campus.web) == set(named)


MATRIX = [(least, method, path) for least, group in LEAST.items() for method, path in sorted(group)]


def call(campus: Campus, who: httpx.AsyncClient, method: str, path: str, **headers: str) -> httpx.Response:
    form = not path.startswith("/api/")
    more: dict[str, object] = {"data": {"a": "b"}} if form else {"json": {}}
    if method == "GET":
        more = {}
    return campus.web.request(
        method, address(path), by=who, headers={**(HTML if form else {}), **headers}, **more
    )


def test_every_route_and_every_role(campus: Campus) -> None:
    """Let in means: the answer is about the request (404, 422, ...), not about who asks."""
    for least, method, path in MATRIX:
        for role in ROLES:
            response = call(campus, campus.people[role], method, path)
            allowed = ROLES.index(role) >= ROLES.index(least)
            about_role = response.status_code == 403 and "your role is" in response.text
            case = (method, path, role, response.status_code, response.text[:300])
            assert about_role != allowed, case
            assert response.status_code != 401, case
            assert response.status_code < 500, case


def test_every_route_and_nobody(campus: Campus) -> None:
    for _, method, path in MATRIX:
        response = call(campus, campus.people["nobody"], method, path)
        if method == "GET" and not path.startswith("/api/"):
            assert response.status_code == 303, (method, path)
            assert response.headers["location"].startswith("/sign-in?next=")
        else:
            assert response.status_code == 401, (method, path, response.text[:200])
    # The form of the sign-in needs its token, as every form.
    for method, path in OPEN - {("POST", "/sign-in")}:
        response = call(campus, campus.people["nobody"], method, path)
        assert response.status_code not in (401, 403, 500), (method, path)
        assert not response.headers.get("location", "").startswith("/sign-in")


def test_every_route_and_every_scope(campus: Campus) -> None:
    reach = {"viewer": 0, "editor": 1, "approver": 2, "admin": 3}
    for least, method, path in MATRIX:
        for number, token in enumerate(campus.tokens.values()):
            bearer = f"Bearer {token}"
            response = call(campus, campus.people["nobody"], method, path, authorization=bearer)
            about_role = response.status_code == 403 and "your role is" in response.text
            assert about_role == (number < reach[least]), (method, path, number, response.text[:200])


def test_every_form_needs_its_token(campus: Campus) -> None:
    """A session alone changes nothing: the form of a foreign page lacks the token."""
    for _, method, path in MATRIX:
        if method == "POST" and not path.startswith("/api/"):
            response = call(campus, campus.people["admin"], method, path)
            assert response.status_code == 403, (path, response.status_code)
            assert "form is too old or not ours" in response.text


def test_a_foreign_page_is_refused_even_with_json(campus: Campus) -> None:
    foreign = {"sec-fetch-site": "cross-site"}
    for _, method, path in MATRIX:
        if method != "GET":
            response = call(campus, campus.people["admin"], method, path, **foreign)
            assert response.status_code == 403, (method, path)


def test_tokens_are_in_no_log(campus: Campus, capfd: pytest.CaptureFixture[str], caplog: object) -> None:
    bearer = f"Bearer {campus.tokens['write']}"
    campus.web.request(
        "POST",
        "/api/v1/lasers",
        by=campus.people["nobody"],
        json=laser("LOGGED"),
        headers={"authorization": bearer},
    )
    told = campus.web.request("GET", "/api/v1/audit/export", by=campus.people["admin"])
    assert "LOGGED" in told.text
    seen = told.text + "".join(capfd.readouterr()) + caplog.text  # type: ignore[attr-defined]
    assert campus.tokens["write"] not in seen
    assert PASSWORD not in seen
