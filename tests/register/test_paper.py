"""Sign and report of a stored laser: of the revision in force, and saying so."""

from __future__ import annotations

from typing import Any

import pypdfium2
import pytest

from service.register import in_force
from tests.register.web import HTML, LASERS, Web, laser
from tests.web.shape import assert_problem

JSON = {"accept": "application/json"}


def words(data: bytes) -> str:
    """What stands on the first page of a PDF, in one line."""
    with pypdfium2.PdfDocument(data) as document:
        return " ".join(document[0].get_textpage().get_text_range().split())


def approved(web: Web, **more: Any) -> dict[str, Any]:
    """A laser whose first revision is approved."""
    found = web.create(laser(**more))
    found = web.ok(web.step(found, "submit"))
    return web.ok(web.step(found, "approve"))  # type: ignore[no-any-return]


def rows(sign: dict[str, Any]) -> dict[str, list[str]]:
    """Lines of the sign by row."""
    return {row["id"]: row["lines"] for row in sign["content"]["rows"]}


def test_a_draft_says_that_nobody_approved_it(web: Web) -> None:
    web.create(laser(place="Room 2.14", owner="A. Example"))
    answer = web.get(f"{LASERS}/1/sign", headers=JSON)
    assert answer.headers["blinkline-revision"] == "1; not approved"
    told = rows(web.ok(answer))
    assert told["extra"] == ["Not approved (BL-001, revision 1)"]
    assert told["room"] == ["Room 2.14"]
    report = words(web.get("/lasers/1/report").content)
    assert "Not approved (BL-001, revision 1)" in report
    assert "Room 2.14" in report
    assert "A. Example" in report


def test_the_approved_revision_stays_in_force_beside_a_draft(web: Web) -> None:
    found = approved(web)
    web.ok(web.put(found, laser(power_w=0.7)))
    alone = {"evaluation": laser()["request"], "sign": {}}
    for url in (f"{LASERS}/1/sign", "/lasers/1/sign"):
        answer = web.get(url, headers=JSON)
        assert answer.headers["blinkline-revision"] == "1; approved"
        told = rows(web.ok(answer))
        assert "extra" not in told
        same = rows(web.ok(web.post("/api/v1/sign", alone, headers=JSON)))
        assert [told[k] for k in ("output", "distance", "eyewear")] == [
            same[k] for k in ("output", "distance", "eyewear")
        ]
    pdf = web.get(f"{LASERS}/1/report?paper=letter&date=2026-12-01")
    assert pdf.headers["content-type"] == "application/pdf"
    told = words(pdf.content)
    assert "BL-001, revision 1, approved 2" in told
    assert "2026-12-01" in told
    assert "of revision 1, which is in force" in web.get("/lasers/1", headers=HTML).text


def test_how_the_sign_looks_is_asked_for_as_on_its_page(web: Web) -> None:
    approved(web, place="Room 2.14")
    own = "sign-v=1&sign-family=ansi&sign-language=de&sign-room=Lab"
    answer = web.ok(web.get(f"{LASERS}/1/sign?format=json&{own}"))
    assert rows(answer)["room"] == ["Lab"]
    assert web.get(f"{LASERS}/1/sign?{own}&format=svg").content.startswith(b"<svg")
    assert (
        web.get("/lasers/1/sign", headers={**HTML, "accept": "text/html,*/*;q=0.8"}).content[:5] == b"%PDF-"
    )
    look = web.get("/lasers/1/sign/look", headers=HTML)
    assert look.status_code == 303
    page = web.get(look.headers["location"], headers=HTML)
    assert page.status_code == 200
    assert 'value="Room 2.14"' in page.text
    for url in (f"{LASERS}/1/sign?colour=red", f"{LASERS}/1/sign?sign-v=1&sign-family=none"):
        assert web.get(url).status_code in (400, 422)
    assert web.get(f"{LASERS}/1/report?colour=red").status_code in (400, 422)


def test_the_address_on_a_sign_is_that_of_its_laser(address: str) -> None:
    """Behind a named proxy that speaks TLS the address says so; from others the header counts nothing."""
    for proxies, scheme in (("", "http"), ("127.0.0.1", "https")):
        web = Web(address, proxies=proxies)
        if not proxies:
            web.create(laser())
        told = web.ok(web.get(f"{LASERS}/1/sign", headers={**JSON, "x-forwarded-proto": "https"}))
        assert told["content"]["address"] == f"{scheme}://127.0.0.1:8321/lasers/1"
        web.close()


def test_a_sign_shows_no_figure_that_nobody_approved(web: Web, monkeypatch: pytest.MonkeyPatch) -> None:
    """Other tables, as if they gave a distance of 7 m; the approved revision has 99.8 m."""
    approved(web)
    kept = in_force.kept

    def other(request: Any) -> Any:
        found = kept(request)
        figures = found.figures.model_copy(update={"eye_hazard_distance_m": 7.0})
        return type(found)(found.request, figures, found.result)

    monkeypatch.setattr(in_force, "kept", other)
    for url in (f"{LASERS}/1/sign", f"{LASERS}/1/report"):
        assert "revision 1" in assert_problem(web.get(url), 409)["detail"]
    assert web.get("/lasers/1/sign/look", headers=HTML).status_code == 409


def test_nothing_of_a_retired_laser_is_in_force(web: Web) -> None:
    found = approved(web)
    headers = {"if-match": f'"laser-1-{found["version"]}"'}
    web.ok(web.request("DELETE", f"{LASERS}/1", headers=headers))
    assert_problem(web.get(f"{LASERS}/1/sign"), 409)
    assert_problem(web.get(f"{LASERS}/1/report"), 409)
    assert_problem(web.get(f"{LASERS}/2/sign"), 404)
    assert "/lasers/1/sign" not in web.get("/lasers/1", headers=HTML).text
