"""Lasers, revisions and sign-off through the API. What is expected follows from issue text and RFC 9110."""

from __future__ import annotations

import pytest

from tests.register.web import LASERS, Web, laser
from tests.web.client import EVALUATE, GOOD
from tests.web.shape import assert_problem


def test_a_stored_laser_carries_what_the_evaluation_says(web: Web) -> None:
    found = web.create(laser(place="Building 4", owner="A. Example", review_due="2027-01-31"))
    answer = web.ok(web.post(EVALUATE, GOOD))
    assert found["eye_hazard_distance_m"] == answer["eye"]["hazard_distance_m"]
    assert found["skin_hazard_distance_m"] == answer["skin"]["hazard_distance_m"]
    assert found["optical_density"] == answer["eye"]["optical_density"]
    assert found["hazard_class"] == answer["classification"][0]["hazard_class"]
    # Closed form of the example of contract v1: 99.8 m (99.7519 to six digits).
    assert found["eye_hazard_distance_m"] == pytest.approx(99.7519, rel=1e-6)
    assert (found["status"], found["version"], found["revision"]) == ("draft", 1, 1)
    assert (found["place"], found["review_due"], found["overdue"]) == ("Building 4", "2027-01-31", False)
    current = found["current"]
    assert current["tables"]["rules/icnirp-2013"] == answer["provenance"]["rules_digest"]
    assert current["service_version"] == answer["provenance"]["service_version"]
    kept = web.ok(web.get(f"{LASERS}/{found['id']}/evaluation"))
    assert kept == answer
    assert web.ok(web.get(f"{LASERS}/{found['id']}/revisions/1"))["result"] == answer


def test_location_and_etag_of_a_new_laser(web: Web) -> None:
    response = web.post(LASERS, laser())
    where = response.headers["location"]
    again = web.get(where)
    assert again.json() == response.json()
    assert again.headers["etag"] == response.headers["etag"]
    unchanged = web.get(where, headers={"if-none-match": again.headers["etag"]})
    assert (unchanged.status_code, unchanged.content) == (304, b"")


def test_the_label_of_the_request_names_the_laser(web: Web) -> None:
    body = laser()
    del body["label"]
    assert web.create(body)["label"] == GOOD["label"]


def test_an_asset_tag_is_taken_once(web: Web) -> None:
    web.create(laser())
    assert_problem(web.post(LASERS, laser()), 409)


REFUSED = {
    "no tag": ({"request": GOOD}, "asset_tag"),
    "blank tag": ({"asset_tag": "  ", "request": GOOD}, "asset_tag"),
    "no request": ({"asset_tag": "x"}, "request"),
    "unknown field": ({**laser(), "colour": "red"}, "colour"),
    "control character": ({**laser(), "place": "a\x00b"}, "place"),
    "long text": ({**laser(), "owner": "x" * 201}, "owner"),
    "no date": ({**laser(), "review_due": "31.1.2027"}, "review_due"),
    "number for text": ({**laser(), "place": 4}, "place"),
    "request": ({"asset_tag": "x", "request": {**GOOD, "lines": []}}, "request.lines"),
    "deep": (
        {"asset_tag": "x", "request": {"lines": [{**GOOD["lines"][0], "wavelength_nm": 1}]}},
        "request.lines.0.wavelength_nm",
    ),
    "rule set": ({"asset_tag": "x", "request": {**GOOD, "rules": "none"}}, "rules"),
}


def test_wrong_bodies_name_their_field(web: Web) -> None:
    for body, field in REFUSED.values():
        assert_problem(web.post(LASERS, body), 422, field)
    assert web.ok(web.get(LASERS))["total"] == 0


def test_a_change_needs_the_version_that_was_read(web: Web) -> None:
    found = web.create(laser())
    url = f"{LASERS}/{found['id']}"
    changed = laser(place="Building 5")
    assert_problem(web.request("PUT", url, json=changed), 428)
    assert_problem(web.request("PUT", url, json=changed, headers={"if-match": '"laser-1-99"'}), 412)
    assert_problem(web.request("PUT", url, json=changed, headers={"if-match": "nonsense"}), 412)
    assert web.ok(web.put(found, changed))["version"] == 2
    assert_problem(web.put(found, laser(place="Building 6")), 412)
    assert web.ok(web.get(url))["place"] == "Building 5"


def test_identity_changes_make_no_revision_and_nothing_twice(web: Web) -> None:
    found = web.create(laser())
    moved = web.ok(web.put(found, laser(place="Elsewhere", label="Another name")))
    assert (moved["version"], moved["revision"], moved["label"]) == (2, 1, "Another name")
    same = web.ok(web.put(moved, laser(place="Elsewhere", label="Another name")))
    assert same["version"] == 2


def test_another_request_is_another_revision(web: Web) -> None:
    found = web.create(laser())
    changed = web.ok(web.put(found, laser(power_w=0.2, reason="New diode")))
    assert (changed["version"], changed["revision"], changed["status"]) == (2, 2, "draft")
    newest, first = web.ok(web.get(f"{LASERS}/{found['id']}/revisions"))
    assert (newest["number"], newest["state"], newest["reason"]) == (2, "draft", "New diode")
    assert (first["number"], first["state"]) == (1, "superseded")
    assert first["figures"]["eye_hazard_distance_m"] == found["eye_hazard_distance_m"]
    difference = web.ok(web.get(f"{LASERS}/{found['id']}/difference/1/2"))
    assert difference["inputs"] == [{"field": "lines.0.emission.power_w", "old": 0.1, "new": 0.2}]
    told = {c["field"]: (c["old"], c["new"]) for c in difference["figures"]}
    # Twice the power is twice the exposure.
    old, new = told["eye_hazard_ratio"]
    assert new == pytest.approx(2 * old, rel=1e-12)
    assert told["optical_density"][1] == pytest.approx(told["optical_density"][0] + 0.30103, abs=1e-5)


def test_the_way_of_a_revision(web: Web) -> None:
    found = web.create(laser())
    assert_problem(web.step(found, "approve"), 409)
    submitted = web.ok(web.step(found, "submit", comment="Please look"))
    assert submitted["status"] == "submitted"
    assert_problem(web.step(found, "submit"), 409)
    assert_problem(web.put(submitted, laser(power_w=0.2)), 409)
    assert_problem(web.step(found, "return"), 422, "comment")
    returned = web.ok(web.step(found, "return", comment="Measure the divergence"))
    assert (returned["status"], returned["current"]["state"]) == ("draft", "returned")
    web.ok(web.step(found, "submit"))
    withdrawn = web.ok(web.step(found, "withdraw"))
    assert withdrawn["status"] == "draft"
    web.ok(web.step(found, "submit"))
    approved = web.ok(web.step(found, "approve", comment="Good", review_due="2027-06-01"))
    assert (approved["status"], approved["approved_revision"]) == ("approved", 1)
    assert approved["review_due"] == "2027-06-01"
    steps = [d["action"] for d in approved["current"]["decisions"]]
    assert steps == ["submitted", "returned", "submitted", "withdrawn", "submitted", "approved"]
    assert approved["current"]["decisions"][1]["comment"] == "Measure the divergence"


def test_an_approved_revision_stays_until_the_next_is_approved(web: Web) -> None:
    found = web.create(laser())
    web.ok(web.step(found, "submit"))
    approved = web.ok(web.step(found, "approve"))
    changed = web.ok(web.put(approved, laser(power_w=0.2)))
    assert (changed["status"], changed["revision"], changed["approved_revision"]) == ("draft", 2, 1)
    states = {r["number"]: r["state"] for r in web.ok(web.get(f"{LASERS}/{found['id']}/revisions"))}
    assert states == {2: "draft", 1: "approved"}
    assert_problem(web.step(found, "approve"), 409)
    web.ok(web.step(changed, "submit"))
    assert web.ok(web.step(changed, "approve"))["approved_revision"] == 2
    states = {r["number"]: r["state"] for r in web.ok(web.get(f"{LASERS}/{found['id']}/revisions"))}
    assert states == {2: "approved", 1: "superseded"}


def test_a_decision_can_name_the_version(web: Web) -> None:
    found = web.create(laser())
    url = f"{LASERS}/{found['id']}/revisions/1/submit"
    assert_problem(web.post(url, {}, headers={"if-match": f'"laser-{found["id"]}-7"'}), 412)
    web.ok(web.post(url, {}, headers={"if-match": f'"laser-{found["id"]}-1"'}))


def test_nothing_is_removed(web: Web) -> None:
    found = web.create(laser())
    url = f"{LASERS}/{found['id']}"
    assert_problem(web.request("DELETE", url), 428)
    retired = web.ok(web.request("DELETE", url, headers={"if-match": f'"laser-{found["id"]}-1"'}))
    assert retired["status"] == "retired"
    assert_problem(web.put(retired, laser(power_w=0.2)), 409)
    assert_problem(web.step(found, "submit"), 409)
    assert web.ok(web.get(f"{url}/revisions"))[0]["number"] == 1
    assert web.ok(web.get(f"{LASERS}?status=current"))["total"] == 0
    back = web.ok(web.post(f"{url}/reinstate", {}))
    assert (back["status"], back["approved_revision"]) == ("draft", None)
    assert_problem(web.post(f"{url}/reinstate", {}), 409)


def test_a_reinstated_laser_has_nothing_in_force(web: Web) -> None:
    found = web.create(laser())
    web.ok(web.step(found, "submit"))
    approved = web.ok(web.step(found, "approve"))
    tag = f'"laser-{found["id"]}-{approved["version"]}"'
    web.ok(web.request("DELETE", f"{LASERS}/{found['id']}", headers={"if-match": tag}))
    back = web.ok(web.post(f"{LASERS}/{found['id']}/reinstate", {}))
    assert (back["current"]["state"], back["approved_revision"]) == ("draft", None)


def test_review_dates(web: Web) -> None:
    found = web.create(laser())
    url = f"{LASERS}/{found['id']}/review"
    late = web.ok(web.request("PUT", url, json={"review_due": "2020-01-01"}))
    assert (late["overdue"], late["version"]) == (True, 2)
    assert web.ok(web.get(f"{LASERS}?overdue=true"))["total"] == 1
    none = web.ok(web.request("PUT", url, json={"review_due": None}))
    assert (none["review_due"], none["overdue"]) == (None, False)
    assert_problem(web.request("PUT", url, json={}), 422, "review_due")


def test_an_idempotency_key_makes_a_retry_harmless(web: Web) -> None:
    headers = {"idempotency-key": "one"}
    first = web.post(LASERS, laser(), headers=headers)
    second = web.post(LASERS, laser(), headers=headers)
    assert (first.status_code, second.status_code) == (201, 201)
    assert first.text == second.text
    assert first.headers["location"] == second.headers["location"]
    assert web.ok(web.get(LASERS))["total"] == 1
    assert_problem(web.post(LASERS, laser("BL-002"), headers=headers), 422)
    refused = web.post(LASERS, laser("BL-003"), headers={"idempotency-key": ""})
    assert_problem(refused, 422, "Idempotency-Key")
    many = web.together([("POST", LASERS, {"json": laser("BL-9"), "headers": {"idempotency-key": "k"}})] * 8)
    assert {r.status_code for r in many} == {201}
    assert len({r.text for r in many}) == 1


def test_unknown_lasers(web: Web) -> None:
    for path in ("99", "99/revisions", "99/revisions/1", "99/evaluation", "99/eyewear", "99999999999"):
        assert_problem(web.get(f"{LASERS}/{path}"), 404)


def test_evaluating_anew_makes_a_draft(web: Web) -> None:
    found = web.create(laser())
    anew = web.ok(web.post(f"{LASERS}/{found['id']}/evaluate-anew", {"reason": "yearly"}))
    assert (anew["revision"], anew["status"], anew["current"]["reason"]) == (2, "draft", "yearly")
    assert anew["request"] == found["request"]
    assert anew["current"]["figures"] == found["current"]["figures"]
