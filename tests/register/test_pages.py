"""The pages of the register: whole trees, titles, forms with their token, steps that work without script."""

from __future__ import annotations

import json
import re
from pathlib import Path
from urllib.parse import parse_qsl

import pytest

from service.contract.request import EvaluationRequest
from service.files import TEMPLATES
from service.register import accounts
from service.register.accounts import UserIn
from service.register.actor import Actor
from service.web.register.address import evaluate_address, request_of_query
from tests.register.test_csv import ROW, table
from tests.register.web import HTML, LASERS, PAIR, Web, laser
from tests.web.markup import Element, parse
from tests.web.pages import CW
from tests.web.pages import address as evaluate
from tests.web.test_pages import FORMS

QUERY = evaluate(CW).partition("?")[2]


def shown(web: Web, url: str, status: int = 200) -> Element:
    response = web.get(url, headers=HTML)
    assert response.status_code == status, (url, response.status_code, response.text[:300])
    assert response.headers["cache-control"] == "no-store"
    assert " style=" not in response.text
    assert "<script>" not in response.text
    root = parse(response.text)
    assert root.one("title").text.endswith("Blinkline")
    assert len(root.all("h1")) == 1
    assert len(root.ids) == len(set(root.ids)), [i for i in root.ids if root.ids.count(i) > 1]
    labels = {label.attributes.get("for") for label in root.all("label")}
    for form in root.all("form"):
        if form.attributes.get("method") == "post":
            assert form.all("input", name="csrf"), url
    for field in [*root.all("input"), *root.all("select"), *root.all("textarea")]:
        kind = field.attributes.get("type")
        if kind not in ("hidden", "checkbox"):
            assert field.attributes.get("id") in labels, (url, field.attributes)
    return root


@pytest.fixture
def filled(web: Web) -> Web:
    rows = [ROW.format(n=n) for n in range(60)]
    web.post(f"{LASERS}/import", content=table(*rows).encode(), headers={"content-type": "text/csv"})
    web.ok(web.post("/api/v1/eyewear", PAIR), 201)
    named = {"place": "<script>alert(1)</script>", "owner": "a & b"}
    found = web.create(laser("FULL", **named))
    web.ok(web.step(found, "submit", comment="<b>"))
    approved = web.ok(web.step(found, "approve", review_due="2020-01-01"))
    named |= {"review_due": "2020-01-01", "reason": "<i>stronger</i>"}
    web.ok(web.put(approved, laser("FULL", power_w=0.3, **named)))
    return web


def test_every_page(filled: Web) -> None:
    for url in (
        "/lasers",
        "/lasers?status=current&sort=distance&descending=true",
        "/lasers?q=nothing+like+it",
        "/lasers/import",
        f"/lasers/new?{QUERY}",
        "/lasers/61",
        "/lasers/61/edit",
        "/lasers/61/revisions/1",
        "/lasers/61/revisions/2",
        "/lasers/1",
        "/overview",
        "/shelf",
        "/shelf/new",
        "/shelf/1",
        "/reevaluations",
        "/audit",
        "/users",
        "/account",
    ):
        root = shown(filled, url)
        assert "Sign-in is off" in root.text
    text = filled.get("/lasers/61", headers=HTML).text
    assert "&lt;script&gt;alert(1)" in text
    assert "review overdue" in text
    for url in ("/lasers/999", "/lasers/61/revisions/9", "/shelf/99", "/reevaluations/9"):
        assert filled.get(url, headers=HTML).status_code == 404


def test_no_template_is_left_out() -> None:
    """Each page template is named by a route; parts are included by others."""
    code = "".join(p.read_text() for p in Path("service/web/register").glob("*.py"))
    parts = "".join(p.read_text() for p in (TEMPLATES / "register").glob("*.html"))
    for file in (TEMPLATES / "register").glob("*.html"):
        assert f'"{file.name}"' in code or f"register/{file.name}" in parts, file.name


def test_the_list_goes_on_and_keeps_its_filters(filled: Web) -> None:
    root = shown(filled, "/lasers?status=draft&sort=label")
    assert len(root.one("table").all("tr")) == 51
    (following,) = (a for a in root.all("a") if a.text == "Next page")
    second = shown(filled, following.attributes["href"])
    assert len(second.one("table").all("tr")) == 12
    assert second.by_id("status").one("option", selected="").text == "draft"


def test_a_setup_is_saved_from_its_evaluation(web: Web) -> None:
    page = parse(web.get(evaluate(CW), headers=HTML).text)
    (link,) = (a for a in page.all("a") if a.text == "Save to the register")
    url = link.attributes["href"]
    saved = web.form("/lasers/new", {"setup": QUERY, "asset_tag": "BL-7", "place": "Room 1"}, page=url)
    assert saved.headers["location"] == "/lasers/1?done=created"
    found = web.ok(web.get(f"{LASERS}/1"))
    assert (found["asset_tag"], found["label"], found["place"]) == ("BL-7", CW["label"], "Room 1")
    root = shown(web, "/lasers/1")
    (link,) = (a for a in root.all("a") if a.text.startswith("Open the evaluation"))
    query = link.attributes["href"].partition("?")[2]
    assert request_of_query(query) == request_of_query(QUERY)
    again = web.form("/lasers/new", {"setup": QUERY, "asset_tag": "BL-7"}, page=url)
    assert again.status_code == 409
    assert "is taken" in again.text


def test_a_changed_setup_becomes_a_revision(web: Web) -> None:
    web.form(
        "/lasers/new",
        {"setup": QUERY, "asset_tag": "BL-7", "label": CW["label"]},
        page=f"/lasers/new?{QUERY}",
    )
    query = QUERY.replace("power_w-1=0.1", "power_w-1=0.2")
    root = shown(web, f"/lasers/new?{query}")
    assert "Save as a revision of BL-7" in root.text
    fields = {"setup": query, "revise": "1", "reason": "New diode"}
    done = web.form("/lasers/new", fields, page=f"/lasers/new?{query}")
    assert done.headers["location"] == "/lasers/1?done=changed"
    root = shown(web, "/lasers/1/revisions/2")
    (row,) = (r for r in root.all("tr") if r.text.startswith("line 1 emission power_w"))
    assert [c.text for c in row.all("td")] == ["0.1", "0.2"]


@pytest.mark.parametrize("fields", FORMS.values(), ids=FORMS.keys())
def test_a_stored_request_leads_back_to_its_evaluation(fields: dict[str, str]) -> None:
    request = request_of_query(evaluate(fields).partition("?")[2])
    found = evaluate_address(request)
    assert found is not None
    assert request_of_query(found.partition("?")[2]) == request


def test_what_the_form_cannot_hold_has_no_address() -> None:
    request = EvaluationRequest.model_validate(laser()["request"])
    strange = request.model_copy(update={"label": "a" + chr(1)})
    found = evaluate_address(strange)
    assert found is None or dict(parse_qsl(found))["label"] == strange.label


def test_steps_of_the_page(web: Web) -> None:
    web.create(laser())
    url = "/lasers/1"
    assert (
        web.form(url, {"step": "submit", "version": "1", "comment": "look"})
        .headers["location"]
        .endswith("submit")
    )
    page = shown(web, url)
    assert "Approve" in page.text
    decide = "/lasers/1/revisions/1"
    without = web.form(decide, {"step": "return", "version": "2"}, page=url)
    assert (without.status_code, "a comment is needed" in without.text) == (422, True)
    stale = web.form(decide, {"step": "approve", "version": "1"}, page=url)
    assert stale.status_code == 412
    done = web.form(decide, {"step": "approve", "version": "2", "review_due": "2027-01-01"}, page=url)
    assert done.headers["location"] == "/lasers/1?done=approve"
    assert "approved and locked" in shown(web, url).text
    for step, status in (
        ("review", "approved"),
        ("anew", "draft"),
        ("retire", "retired"),
        ("reinstate", "draft"),
    ):
        version = str(web.ok(web.get(f"{LASERS}/1"))["version"])
        fields = {"step": step, "version": version, "review_due": "2028-01-01"}
        assert web.form(url, fields).status_code == 303, step
        assert web.ok(web.get(f"{LASERS}/1"))["status"] == status
    assert web.form(url, {"step": "explode"}).status_code == 422


def test_editing_on_the_page(web: Web) -> None:
    web.create(laser())
    fields = {"asset_tag": "BL-001", "label": "L", "version": "1", "reason": "why", "request": "{"}
    assert "this is not JSON" in web.form("/lasers/1/edit", fields).text
    fields["request"] = json.dumps(laser(power_w=0.2)["request"])
    assert web.form("/lasers/1/edit", fields).headers["location"] == "/lasers/1?done=changed"
    assert web.form("/lasers/1/edit", fields).status_code == 412
    found = web.ok(web.get(f"{LASERS}/1"))
    assert (found["revision"], found["current"]["reason"]) == (2, "why")


def test_one_step_for_several_lasers(filled: Web) -> None:
    fields = {"pick-1": "1", "pick-2": "1", "pick-61": "1"}
    done = filled.form("/lasers/bulk", {**fields, "step": "submit"}, page="/lasers")
    assert "Done for 3 lasers" in done.text
    again = filled.form("/lasers/bulk", {**fields, "step": "submit"}, page="/lasers")
    assert "Not done for 3" in again.text
    dates = filled.form(
        "/lasers/bulk", {**fields, "step": "review", "review_due": "2029-01-01"}, page="/lasers"
    )
    assert "Done for 3 lasers" in dates.text
    assert "No laser was selected" in filled.form("/lasers/bulk", {"step": "retire"}, page="/lasers").text


def test_the_shelf_on_the_page(web: Web) -> None:
    fields = {
        "tag": "E1",
        "name": "Green",
        "ranges": "515-540: OD 6 | D LB6",
        "quantity": "2",
        "light_percent": "24",
    }
    wrong = web.form("/shelf/new", {**fields, "ranges": "green"})
    assert (wrong.status_code, "is no range" in wrong.text) == (422, True)
    assert web.form("/shelf/new", {**fields, "quantity": "many"}).status_code == 422
    assert web.form("/shelf/new", fields).headers["location"] == "/shelf/1?done=added"
    web.create(laser())
    root = shown(web, "/shelf/1")
    assert "will do" in root.text
    assert root.by_id("ranges").attributes["value"] == "515-540: OD 6 | D LB6"
    assert web.form("/shelf/1", {**fields, "version": "1", "retired": "yes"}).status_code == 303
    assert web.form("/shelf/1", {**fields, "version": "1"}).status_code == 412
    assert "out of use" in shown(web, "/shelf/1").text


def test_users_and_tokens_on_the_page(tmp_path: Path) -> None:
    web = Web(f"sqlite:///{tmp_path}/r.sqlite3", base="https://register.test", sign_in="password")
    assert "There is no user yet" in shown(web, "/sign-in").text
    with web.app.state.register.write() as connection:
        body = UserIn(name="lso", role="admin", password="correct horse battery")
        accounts.add_user(connection, Actor("setup", "admin", "command"), body)
    web.form("/sign-in", {"name": "lso", "password": "correct horse battery"})
    added = {"name": "anna", "role": "editor", "password": "another password"}
    assert web.form("/users", added).headers["location"] == "/users"
    assert web.form("/users", added).status_code == 409
    assert web.form("/users", {"user": "2", "role": "viewer", "active": "yes"}).status_code == 303
    assert "anna" in shown(web, "/users").text
    made = web.form("/account", {"step": "token", "name": "script", "scope": "read", "days": ""})
    (secret,) = re.findall(r"blk_[\w-]+", made.text)
    assert secret not in web.get("/account", headers=HTML).text
    visitor = web.visitor()
    bearer = {"authorization": f"Bearer {secret}"}
    assert web.request("GET", LASERS, by=visitor, headers=bearer).status_code == 200
    assert web.form("/account", {"step": "revoke-1"}).status_code == 200
    assert web.request("GET", LASERS, by=visitor, headers=bearer).status_code == 401
    web.close()


def test_pages_with_figures_carry_the_cautions(filled: Web) -> None:
    (found,) = filled.ok(filled.get(f"{LASERS}?asset_tag=FULL"))["items"]
    number = found["id"]
    for url in (
        *("/lasers", "/overview", f"/lasers/{number}", f"/lasers/{number}/revisions/1"),
        f"/lasers/new?{QUERY}",
    ):
        text = shown(filled, url).text
        assert "Never look into a beam" in text, url
        assert "prevail over anything shown here" in text, url
