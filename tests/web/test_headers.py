"""Headers on every answer, methods, static files and health."""

from __future__ import annotations

import hashlib
import re

import pytest

from service.files import STATIC
from service.web import api, pages
from tests.web.client import EVALUATE, GOOD, RULES, Client
from tests.web.pages import CW, HTML, address, page
from tests.web.shape import assert_problem

ANSWERS = {
    "form": ("GET", "/", 200),
    "result": ("GET", address(CW), 200),
    "redirect": ("GET", "/evaluate", 303),
    "wrong value": ("GET", address({**CW, "power_w-1": "x"}), 422),
    "bad address": ("GET", "/evaluate?v=0", 400),
    "rules": ("GET", "/rules", 200),
    "rule set": ("GET", f"/rules/{RULES[0]}", 200),
    "style": ("GET", "/static/app.css", 200),
    "mark": ("GET", "/static/mark.svg", 200),
    "icon": ("GET", "/favicon.ico", 200),
    "nothing": ("GET", "/nowhere", 404),
    "nothing static": ("GET", "/static/none.css", 404),
    "rules as JSON": ("GET", "/api/v1/rules", 200),
    "description": ("GET", "/api/v1/openapi.json", 200),
    "nothing in the API": ("GET", "/api/v1/nowhere", 404),
    "no body": ("POST", EVALUATE, 415),
    "method": ("DELETE", EVALUATE, 405),
    "health": ("GET", "/health/live", 200),
}


def assert_secure(headers: dict[str, str]) -> None:
    """Deny all, allow by name; nothing unsafe, nothing from elsewhere."""
    policy = headers["content-security-policy"]
    directives = dict(part.strip().partition(" ")[::2] for part in policy.split(";"))
    assert directives["default-src"] == "'none'"
    for name in ("base-uri", "frame-ancestors"):
        assert directives[name] == "'none'"
    assert directives["form-action"] == "'self'"
    assert set(" ".join(directives.values()).split()) <= {"'none'", "'self'"}
    assert "unsafe" not in policy
    assert headers["x-content-type-options"] == "nosniff"
    assert headers["referrer-policy"] == "no-referrer"
    assert headers["cross-origin-opener-policy"] == "same-origin"
    assert "server" not in headers
    assert "x-powered-by" not in headers
    assert "set-cookie" not in headers


@pytest.mark.parametrize("accept", [HTML, {}], ids=["people", "programs"])
@pytest.mark.parametrize("answer", ANSWERS.values(), ids=ANSWERS.keys())
def test_security_headers(client: Client, answer: tuple[str, str, int], accept: dict[str, str]) -> None:
    method, url, status = answer
    response = client.request(method, url, headers=accept)
    if response.status_code == 303 != status:
        response = client.request(method, response.headers["location"], headers=accept)
    assert response.status_code == status
    assert_secure(dict(response.headers))


def fail(*_: object) -> None:
    raise RuntimeError("a secret of the inside")


def test_failures_tell_nothing_of_the_inside(client: Client, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(api, "answer", fail)
    response = client.post(EVALUATE, json=GOOD)
    assert_problem(response, 500)
    assert "secret" not in response.text


def test_failures_of_pages_are_pages(client: Client, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(pages, "answer", fail)
    root = page(client, address(CW), 500)
    assert "secret" not in root.text
    assert "verdict-title" not in root.ids


@pytest.mark.parametrize("accept", [HTML, {}], ids=["people", "programs"])
def test_security_headers_on_failures(
    client: Client, monkeypatch: pytest.MonkeyPatch, accept: dict[str, str]
) -> None:
    monkeypatch.setattr(pages, "answer", fail)
    url = client.get(address(CW)).headers.get("location", address(CW))
    response = client.get(url, headers=accept)
    assert response.status_code == 500
    assert_secure(dict(response.headers))


METHODS = [
    *((method, EVALUATE, "POST") for method in ("GET", "PUT", "PATCH", "DELETE", "OPTIONS", "HEAD")),
    *((method, "/", "GET") for method in ("POST", "PUT", "DELETE", "OPTIONS")),
    *((method, "/health/live", "GET") for method in ("POST", "DELETE")),
    ("POST", "/evaluate", "GET"),
    ("POST", "/static/app.css", "GET"),
    ("PUT", "/api/v1/rules", "GET"),
]


@pytest.mark.parametrize(("method", "url", "allowed"), METHODS)
def test_other_methods_are_refused(client: Client, method: str, url: str, allowed: str) -> None:
    """RFC 9110 15.5.6: 405 names the methods that are allowed."""
    response = client.request(method, url)
    assert allowed in response.headers["allow"].split(", ")
    if method == "HEAD":
        assert (response.status_code, response.content) == (405, b"")
    else:
        assert_problem(response, 405)


@pytest.mark.parametrize("url", ["/", address(CW), "/rules", "/static/app.css", "/health/live"])
def test_head_has_no_body(client: Client, url: str) -> None:
    """Either answered as GET is, or refused with the methods allowed; never with content."""
    response = client.request("HEAD", url)
    assert response.content == b""
    assert response.status_code in (200, 303, 405)
    assert response.status_code != 405 or "GET" in response.headers["allow"]


def test_pages_are_not_kept_by_caches(client: Client) -> None:
    for url in ("/", "/rules", address(CW)):
        assert "no-store" in client.get(page_of(client, url)).headers["cache-control"]


def page_of(client: Client, url: str) -> str:
    return client.get(url).headers.get("location", url)


def test_static_files_are_kept_for_ever_under_their_hash(client: Client) -> None:
    """The address holds the start of the content's SHA-256, so that a new content has a new one."""
    root = page(client, "/")
    addresses = {
        *(e.attributes["href"] for e in root.all("link")),
        *(e.attributes["src"] for e in [*root.all("img"), *root.all("script")]),
    }
    assert len(addresses) >= 2
    for url in addresses:
        match = re.fullmatch(r"/static/([\w.-]+)\?h=([0-9a-f]{8,64})", url)
        assert match, url
        content = (STATIC / match[1]).read_bytes()
        assert hashlib.sha256(content).hexdigest().startswith(match[2])
        response = client.get(url)
        assert response.content == content
        assert response.headers["cache-control"] == "public, max-age=31536000, immutable"
        kinds = {
            "css": "text/css; charset=utf-8",
            "js": "text/javascript; charset=utf-8",
            "svg": "image/svg+xml",
        }
        assert response.headers["content-type"] == kinds[match[1].rpartition(".")[2]]


OTHER_NAMES = ["..%2fapp.py", "%2e%2e/app.py", ".", "__init__.py", "app.css%00", "APP.CSS"]


@pytest.mark.parametrize("name", OTHER_NAMES)
def test_only_named_files_are_served(client: Client, name: str) -> None:
    response = client.get(f"/static/{name}")
    assert response.status_code == 404
    assert response.json()["type"] == "/problems/not-found"


def test_styles_load_nothing_from_elsewhere(client: Client) -> None:
    text = client.get("/static/app.css").text
    assert "@import" not in text
    assert "url(" not in text
    assert "<script" not in client.get("/static/mark.svg").text


def test_health(client: Client) -> None:
    live, ready = client.get("/health/live"), client.get("/health/ready")
    assert (live.status_code, live.json()) == (200, {"status": "live"})
    assert ready.status_code == 200
    assert ready.json()["status"] == "ready"
    assert set(ready.json()["rules"]) == set(RULES)
    version = client.evaluate(GOOD)["provenance"]["service_version"]
    assert ready.json()["version"] == version


PROBLEMS = (
    *("invalid-request", "malformed-body", "body-too-large", "unsupported-media", "not-found"),
    *("bad-address", "http"),
)


@pytest.mark.parametrize("slug", PROBLEMS)
def test_every_type_of_problem_has_its_page(client: Client, slug: str) -> None:
    root = page(client, f"/problems/{slug}")
    assert slug in root.one("h1").text


def test_people_get_pages_and_programs_get_documents(client: Client) -> None:
    assert client.get("/nowhere", headers=HTML).headers["content-type"].startswith("text/html")
    assert_problem(client.get("/nowhere"), 404)
    assert_problem(client.get("/api/v1/nowhere", headers=HTML), 404)
