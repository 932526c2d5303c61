"""Sign-in, sessions, throttling, tokens, the trusted header, and the register without sign-in."""

from __future__ import annotations

import base64
import hashlib

import httpx
import pytest
import sqlalchemy as sa

from service.register import accounts
from service.register.accounts import UserIn
from service.register.actor import Actor
from service.register.schema import attempts, sessions, tokens, users
from service.settings import Settings, SettingsError
from tests.register.web import HTML, LASERS, Web, laser
from tests.web.shape import assert_problem

ADMIN = Actor("setup", "admin", "command")
PASSWORD = "correct horse battery"


@pytest.fixture
def signed(address: str) -> Web:
    web = Web(address, base="https://register.test", sign_in="password", proxies="10.0.0.0/8")
    web.app.state.register.open()
    with web.app.state.register.write() as connection:
        accounts.add_user(connection, ADMIN, UserIn(name="lso", role="admin", password=PASSWORD))
    return web


def sign_in(web: Web, name: str = "lso", password: str = PASSWORD, **fields: str) -> httpx.Response:
    return web.form("/sign-in", {"name": name, "password": password, **fields})


def test_sign_in_and_out(signed: Web) -> None:
    assert signed.get("/lasers", headers=HTML).headers["location"] == "/sign-in?next=%2Flasers"
    response = sign_in(signed, next="/overview")
    assert (response.status_code, response.headers["location"]) == (303, "/overview")
    cookie = response.headers["set-cookie"].lower()
    for part in ("httponly", "samesite=lax", "secure", "path=/"):
        assert part in cookie
    assert signed.get("/lasers", headers=HTML).status_code == 200
    assert signed.ok(signed.get("/api/v1/me")) == {"name": "lso", "role": "admin", "via": "session"}
    out = signed.form("/sign-out", {}, page="/lasers")
    assert (out.status_code, out.headers["location"]) == (303, "/")
    assert_problem(signed.get(LASERS), 401)
    signed.close()


def test_a_hash_names_its_cost_and_holds_when_that_changes(monkeypatch: pytest.MonkeyPatch) -> None:
    """scrypt of RFC 7914 with n = 2^15, r = 8, p = 1, computed here by hashlib."""
    salt = base64.b64encode(b"s" * 16).decode()
    digest = hashlib.scrypt(b"correct", salt=b"s" * 16, n=2**15, r=8, p=1, maxmem=2**26, dklen=32)
    stored = f"scrypt$15${salt}${base64.b64encode(digest).decode()}"
    monkeypatch.setattr(accounts, "COST", 11)
    assert accounts.check_password(stored, "correct")
    assert not accounts.check_password(stored, "Correct")
    assert not accounts.check_password(None, "correct")


def test_nothing_secret_is_stored(signed: Web) -> None:
    sign_in(signed)
    token = signed.ok(signed.post("/api/v1/tokens", {"name": "script", "scope": "write"}), 201)["secret"]
    secret = signed.client.cookies["blinkline_session"]
    with signed.app.state.register.read() as connection:
        stored = connection.execute(sa.select(users.c.password)).scalar_one()
        session = connection.execute(sa.select(sessions.c.digest)).scalar_one()
        digest = connection.execute(sa.select(tokens.c.digest)).scalar_one()
    assert stored.startswith("scrypt$")
    assert PASSWORD not in stored
    assert session == hashlib.sha256(secret.encode()).hexdigest()
    assert digest == hashlib.sha256(token.encode()).hexdigest()
    signed.close()


def test_a_wrong_name_and_a_wrong_password_look_alike(signed: Web) -> None:
    wrong, unknown = sign_in(signed, password="wrong"), sign_in(signed, name="nobody")
    assert (wrong.status_code, unknown.status_code) == (401, 401)
    assert "name or password is wrong" in wrong.text
    assert "name or password is wrong" in unknown.text
    signed.close()


def test_odd_names_and_numbers_are_refused_in_words(signed: Web) -> None:
    for name in ("a\0b", "İ" * 100, "", " "):
        assert sign_in(signed, name=name).status_code == 401
    assert sign_in(signed).status_code == 303
    for method, url in (("DELETE", "/api/v1/tokens/99999999999"), ("PUT", "/api/v1/users/99999999999")):
        assert_problem(signed.request(method, url, json={}), 404)
    signed.close()


def test_failures_are_slowed_down_by_name_and_by_address(signed: Web) -> None:
    for _ in range(5):
        assert sign_in(signed, password="wrong").status_code == 401
    for name in ("lso", "somebody"):
        blocked = sign_in(signed, name=name)
        assert blocked.status_code == 429
        assert 0 < int(blocked.headers["retry-after"]) <= 900
    with signed.app.state.register.write() as connection:
        connection.execute(sa.update(attempts).values(last_at="2020-01-01T00:00:00.000000Z"))
    assert sign_in(signed).status_code == 303
    signed.close()


def test_only_our_pages_follow_a_sign_in(signed: Web) -> None:
    for address in ("https://elsewhere.test/", "//elsewhere.test", "/\\elsewhere.test", "javascript:x"):
        with signed.app.state.register.write() as connection:
            connection.execute(sa.delete(attempts))
        signed.client.cookies.clear()
        assert sign_in(signed, next=address).headers["location"] == "/lasers"
    signed.close()


def test_a_stopped_user_is_out_at_once(signed: Web) -> None:
    sign_in(signed)
    token = signed.ok(signed.post("/api/v1/tokens", {"name": "t", "scope": "read"}), 201)["secret"]
    with signed.app.state.register.write() as connection:
        accounts.add_user(connection, ADMIN, UserIn(name="other", role="admin"))
        accounts.change_user(connection, ADMIN, 1, active=False)
    assert_problem(signed.get(LASERS), 401)
    assert_problem(signed.get(LASERS, headers={"authorization": f"Bearer {token}"}), 401)
    assert sign_in(signed).status_code == 401
    signed.close()


def test_the_last_admin_stays(signed: Web) -> None:
    sign_in(signed)
    assert_problem(signed.request("PUT", "/api/v1/users/1", json={"role": "viewer"}), 409)
    assert_problem(signed.request("PUT", "/api/v1/users/1", json={"active": False}), 409)
    assert signed.ok(signed.get("/api/v1/users"))[0]["role"] == "admin"
    assert_problem(
        signed.post("/api/v1/users", {"name": "a", "role": "viewer", "password": "short"}), 422, "password"
    )
    assert_problem(signed.post("/api/v1/users", {"name": "a", "role": "king"}), 422, "role")
    signed.close()


def test_tokens(signed: Web) -> None:
    sign_in(signed)
    made = signed.ok(signed.post("/api/v1/tokens", {"name": "script", "scope": "read", "days": 1}), 201)
    bearer = {"authorization": f"Bearer {made['secret']}"}
    visitor = signed.visitor()
    signed.ok(signed.request("GET", LASERS, by=visitor, headers=bearer))
    assert_problem(signed.request("POST", LASERS, by=visitor, json=laser(), headers=bearer), 403)
    wide = signed.request(
        "POST", "/api/v1/tokens", by=visitor, json={"name": "w", "scope": "admin"}, headers=bearer
    )
    assert_problem(wide, 403)
    for wrong in ("Bearer", "Bearer x", f"Bearer {made['secret']}x"):
        assert_problem(signed.request("GET", LASERS, by=visitor, headers={"authorization": wrong}), 401)
    with signed.app.state.register.write() as connection:
        connection.execute(sa.update(tokens).values(expires_at="2020-01-01T00:00:00.000000Z"))
    assert_problem(signed.request("GET", LASERS, by=visitor, headers=bearer), 401)
    again = signed.ok(signed.post("/api/v1/tokens", {"name": "script", "scope": "read"}), 201)
    signed.ok(signed.request("DELETE", f"/api/v1/tokens/{again['id']}"))
    bearer = {"authorization": f"Bearer {again['secret']}"}
    assert_problem(signed.request("GET", LASERS, by=visitor, headers=bearer), 401)
    signed.close()


def test_four_eyes(address: str) -> None:
    web = Web(address, base="https://register.test", sign_in="password", four_eyes="on")
    web.app.state.register.open()
    with web.app.state.register.write() as connection:
        for name in ("anna", "bert"):
            body = UserIn(name=name, role="approver", password=PASSWORD)
            accounts.add_user(connection, ADMIN, body)
    sign_in(web, name="anna")
    found = web.create(laser())
    web.ok(web.step(found, "submit"))
    assert "somebody else" in assert_problem(web.step(found, "approve"), 403)["detail"]
    page = web.form("/lasers/1/revisions/1", {"step": "approve"}, page="/lasers/1")
    assert page.status_code == 403
    web.client.cookies.clear()
    sign_in(web, name="bert")
    assert web.ok(web.step(found, "approve"))["current"]["decisions"][-1]["by"] == "bert"
    web.close()


def test_a_password_is_changed_by_who_knows_it(signed: Web) -> None:
    sign_in(signed)
    wrong = signed.form("/account", {"step": "password", "old": "no", "new": "another long one"})
    assert wrong.status_code == 422
    right = signed.form("/account", {"step": "password", "old": PASSWORD, "new": "another long one"})
    assert right.headers["location"] == "/sign-in"
    assert_problem(signed.get(LASERS), 401)
    assert sign_in(signed).status_code == 401
    assert sign_in(signed, password="another long one").status_code == 303
    signed.close()


def test_the_trusted_header_counts_from_the_proxy_alone(address: str) -> None:
    proxy = "10.1.2.3"
    web = Web(
        address, peer=proxy, base="https://register.test", sign_in="header", proxies="10.1.2.3, fd00::/8"
    )
    web.app.state.register.open()
    with web.app.state.register.write() as connection:
        accounts.add_user(connection, ADMIN, UserIn(name="anna", role="editor"))
    header = {"x-remote-user": "anna"}
    assert web.ok(web.get("/api/v1/me", headers=header)) == {
        "name": "anna",
        "role": "editor",
        "via": "header",
    }
    assert_problem(web.get("/api/v1/me"), 401)
    assert_problem(web.get("/api/v1/me", headers={"x-remote-user": "unknown"}), 401)
    assert_problem(web.get("/api/v1/me", headers=[("x-remote-user", "anna"), ("x-remote-user", "b")]), 401)
    for peer in ("10.1.2.4", "127.0.0.1", "not-an-address"):
        assert_problem(web.request("GET", "/api/v1/me", by=web.visitor(peer), headers=header), 401)
    assert_problem(
        web.request("GET", "/api/v1/me", by=web.visitor(), headers={**header, "x-forwarded-for": proxy}), 401
    )
    web.close()


def test_without_sign_in_only_this_machine_gets_in(address: str) -> None:
    web = Web(address)
    assert web.ok(web.get("/api/v1/me")) == {"name": "local", "role": "admin", "via": "local"}
    assert "Sign-in is off" in web.get("/lasers", headers=HTML).text
    refused = [
        web.request("GET", LASERS, by=web.visitor("192.0.2.7")),
        web.get(LASERS, headers={"x-forwarded-for": "192.0.2.7"}),
        web.get(LASERS, headers={"host": "evil.test:8321"}),
        web.get(LASERS, headers={"host": "127.0.0.1.evil.test"}),
        web.post(LASERS, laser(), headers={"sec-fetch-site": "cross-site"}),
    ]
    for response in refused:
        assert_problem(response, 403)
    for host in ("localhost:8321", "127.0.0.1", "[::1]:8321"):
        web.ok(web.get(LASERS, headers={"host": host}))
    assert web.request("GET", "/lasers", by=web.visitor("192.0.2.7"), headers=HTML).status_code == 403
    # A form that another site would send is plain text or url-encoded: the API takes neither.
    assert_problem(
        web.post(f"{LASERS}/1/reinstate", content="{}", headers={"content-type": "text/plain"}), 415
    )
    web.close()


def test_settings_that_do_not_go_together() -> None:
    for name, value in (
        ("SIGN_IN", "maybe"),
        ("SIGN_IN", "header"),
        ("PROXIES", "everybody"),
        ("FOUR_EYES", "two"),
        ("DATABASE", "mysql://host/db"),
        ("DATABASE", "nonsense"),
        ("DATABASE", "sqlite://"),
    ):
        with pytest.raises(SettingsError, match=f"BLINKLINE_{name}"):
            Settings.from_environment({f"BLINKLINE_{name}": value})
