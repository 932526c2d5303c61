"""The eyewear shelf: which pairs will do for a laser, which lasers a pair covers."""

from __future__ import annotations

import copy
from typing import Any

from tests.register.web import LASERS, PAIR, Web, laser
from tests.web.client import EVALUATE, GOOD
from tests.web.shape import assert_problem

SHELF = "/api/v1/eyewear"


def pair(
    tag: str, low: float, high: float, density: float, marking: str | None, **more: Any
) -> dict[str, Any]:
    found = {"from_nm": low, "to_nm": high, "optical_density": density}
    if marking:
        found["marking"] = marking
    return {"tag": tag, "pair": {"name": f"Pair {tag}", "ranges": [found]}, **more}


def test_a_pair_is_stored_and_changed(web: Web) -> None:
    made = web.post(SHELF, PAIR)
    found = web.ok(made, 201)
    url = made.headers["location"]
    assert (found["quantity"], found["place"], found["version"]) == (3, "Cabinet 2", 1)
    assert web.ok(web.get(url)) == found
    assert_problem(web.post(SHELF, PAIR), 409)
    assert_problem(web.request("PUT", url, json={**PAIR, "quantity": 2}), 428)
    tag = made.headers["etag"]
    changed = web.request("PUT", url, json={**PAIR, "quantity": 2}, headers={"if-match": tag})
    assert web.ok(changed)["version"] == 2
    assert_problem(web.request("PUT", url, json={**PAIR, "quantity": 1}, headers={"if-match": tag}), 412)
    assert_problem(web.post(SHELF, {**PAIR, "tag": "E", "quantity": -1}), 422, "quantity")
    assert_problem(web.post(SHELF, {"tag": "E", "pair": {"name": "x", "ranges": []}}), 422, "pair.ranges")
    assert_problem(web.get(f"{SHELF}/99"), 404)


def test_the_shelf_page_by_page(web: Web) -> None:
    for n in range(5):
        web.ok(web.post(SHELF, {**PAIR, "tag": f"E{n}"}), 201)
    first = web.ok(web.get(f"{SHELF}?limit=2"))
    second = web.ok(web.get(f"{SHELF}?limit=10&cursor={first['next']}"))
    assert [p["tag"] for p in first["items"] + second["items"]] == [f"E{n}" for n in range(5)]
    assert second["next"] is None


def test_verdicts_are_those_of_the_evaluation(web: Web) -> None:
    """OD 2.01 is needed (closed form of the contract's example), and a mark that shows resistance."""
    pairs = [
        pair("weak", 515, 540, 1, "D LB1"),
        pair("unmarked", 515, 540, 6, None),
        pair("elsewhere", 1000, 1100, 7, "D LB7"),
        pair("good", 515, 540, 6, "D LB6 + IR LB6"),
        pair("gone", 515, 540, 6, "D LB6", quantity=0),
        pair("retired", 515, 540, 6, "D LB6", retired=True),
    ]
    for p in pairs:
        web.ok(web.post(SHELF, p), 201)
    found = web.ok(web.get(f"{LASERS}/{web.create(laser())['id']}/eyewear"))
    assert found[0]["tag"] == "good"
    assert {p["tag"]: p["sufficient"] for p in found} == {
        "good": True,
        "weak": False,
        "unmarked": False,
        "elsewhere": False,
    }
    asked = copy.deepcopy(GOOD)
    asked["eyewear"] = [p["pair"] for p in pairs[:4]]
    checks = web.ok(web.post(EVALUATE, asked))["protection"]["eyewear"]
    told = {f"Pair {p['tag']}": (p["sufficient"], p["remaining_ratio"]) for p in found}
    assert told == {c["name"]: (c["sufficient"], c["remaining_ratio"]) for c in checks}


def test_lasers_of_a_pair_and_lasers_without(web: Web) -> None:
    web.ok(web.post(SHELF, PAIR), 201)
    green, faint = web.create(laser("GREEN")), web.create(laser("FAINT", power_w=1e-6))
    red = laser("RED")
    red["request"]["lines"][0]["wavelength_nm"] = 633
    web.create(red)
    covered = web.ok(web.get(f"{SHELF}/1/lasers"))
    assert [(m["laser"]["asset_tag"], m["sufficient"]) for m in covered["items"]] == [
        ("GREEN", True),
        ("RED", False),
    ]
    assert covered["unexamined"] == 0
    cover = web.ok(web.get("/api/v1/overview"))["eyewear"]
    assert (cover["needing"], cover["covered"]) == (2, 1)
    assert [x["asset_tag"] for x in cover["without"]] == ["RED"]
    assert faint["optical_density"] == 0
    # Taken off the shelf, the pair covers nothing.
    web.ok(web.request("PUT", f"{SHELF}/1", json={**PAIR, "retired": True}, headers={"if-match": "*"}))
    assert web.ok(web.get(f"{LASERS}/{green['id']}/eyewear")) == []
    cover = web.ok(web.get("/api/v1/overview"))["eyewear"]
    assert [x["asset_tag"] for x in cover["without"]] == ["GREEN", "RED"]


def test_a_verdict_follows_pair_and_laser(web: Web) -> None:
    web.ok(web.post(SHELF, PAIR), 201)
    found = web.create(laser())
    url = f"{LASERS}/{found['id']}/eyewear"
    assert web.ok(web.get(url))[0]["sufficient"]
    changed = pair("EW-1", 1000, 1100, 7, "D LB7")
    web.ok(web.request("PUT", f"{SHELF}/1", json=changed, headers={"if-match": "*"}))
    assert not web.ok(web.get(url))[0]["sufficient"]
    infrared = laser()
    infrared["request"]["lines"][0]["wavelength_nm"] = 1064
    web.ok(web.put(found, infrared))
    assert web.ok(web.get(url))[0]["sufficient"]
