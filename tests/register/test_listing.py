"""Search, filters, order and pages of the list, against the same done by hand on the whole list."""

from __future__ import annotations

import base64
import json

import pytest

from tests.register.web import LASERS, Web, laser
from tests.web.shape import assert_problem

PLACES = ("Attic", "Cellar", "Hall 100%", "Hall_2")


@pytest.fixture
def filled(web: Web) -> Web:
    for n in range(12):
        more = {"review_due": f"20{20 + n}-01-01"} if n % 3 else {}
        body = laser(f"T-{n:02d}", label=f"Laser {'ABC'[n % 3]}", place=PLACES[n % 4], **more)
        body["request"]["lines"][0]["emission"]["power_w"] = 0.0001 * 4**n
        if n == 11:
            # A beam without spread is never safe.
            body["request"]["lines"][0]["beam"]["divergence_mrad"] = 0
        web.create(body)
    return web


def walk(web: Web, query: str, limit: int) -> list[dict[str, object]]:
    found: list[dict[str, object]] = []
    cursor = ""
    while True:
        page = web.ok(web.get(f"{LASERS}?{query}&limit={limit}{cursor}"))
        assert len(page["items"]) <= limit
        found += page["items"]
        if page["next"] is None:
            assert len(found) == page["total"]
            return found
        cursor = f"&cursor={page['next']}"


UNBOUNDED = float("inf")
KEYS = {
    "asset_tag": lambda x: x["asset_tag"],
    "label": lambda x: x["label"],
    "place": lambda x: x["place"],
    "distance": lambda x: UNBOUNDED if x["eye_hazard_distance_m"] is None else x["eye_hazard_distance_m"],
    "density": lambda x: x["optical_density"],
    "class": lambda x: ("1", "1C", "1M", "2", "2M", "3R", "3B", "4").index(x["hazard_class"]),
    "review": lambda x: x["review_due"] or "9999",
    "updated": lambda x: x["updated_at"],
}


def test_pages_hold_every_laser_once_in_order(filled: Web) -> None:
    every = walk(filled, "", 500)
    assert every[-1]["eye_hazard_distance_m"] is None
    for sort, key in KEYS.items():
        for descending in ("false", "true"):
            for limit in (1, 5, 12):
                found = walk(filled, f"sort={sort}&descending={descending}", limit)
                expected = sorted(every, key=lambda x: (key(x), x["id"]), reverse=descending == "true")
                assert [x["id"] for x in found] == [x["id"] for x in expected], (sort, descending, limit)


def test_a_laser_added_meanwhile_neither_doubles_nor_hides_another(filled: Web) -> None:
    first = filled.ok(filled.get(f"{LASERS}?limit=5"))
    filled.create(laser("A-before-all"))
    second = filled.ok(filled.get(f"{LASERS}?limit=500&cursor={first['next']}"))
    tags = [x["asset_tag"] for x in first["items"] + second["items"]]
    assert tags == [f"T-{n:02d}" for n in range(12)]


def test_filters(filled: Web) -> None:
    every = walk(filled, "", 500)

    def tags(query: str) -> list[object]:
        return [x["asset_tag"] for x in walk(filled, query, 500)]

    assert tags("q=b%20LASER") == [x["asset_tag"] for x in every if x["label"] == "Laser B"]
    assert tags("q=CELLAR%20t-05") == ["T-05"]
    # Wildcards of the database are plain characters.
    assert tags("q=100%25") == [x["asset_tag"] for x in every if x["place"] == "Hall 100%"]
    assert tags("q=hall_2") == [x["asset_tag"] for x in every if x["place"] == "Hall_2"]
    assert tags("place=Attic") == ["T-00", "T-04", "T-08"]
    assert tags("asset_tag=T-03") == ["T-03"]
    assert tags("hazard_class=4") == [x["asset_tag"] for x in every if x["hazard_class"] == "4"]
    assert tags("overdue=true") == [x["asset_tag"] for x in every if x["overdue"]]
    assert tags("due_before=2022-06-01") == ["T-01", "T-02"]
    assert tags("rules=eu-2006-25") == []
    assert tags("stale=true") == []
    assert tags("status=draft") == tags("status=current") == [x["asset_tag"] for x in every]


def test_wrong_parameters_are_refused(filled: Web) -> None:
    for query, field in (
        ("colour=red", "colour"),
        ("status=lost", "status"),
        ("sort=age", "sort"),
        ("limit=0", "limit"),
        ("limit=501", "limit"),
        ("overdue=perhaps", "overdue"),
        ("due_before=soon", "due_before"),
        ("status=draft&status=approved", "status"),
        ("cursor=zzz", "cursor"),
    ):
        assert_problem(filled.get(f"{LASERS}?{query}"), 422, field)
    for forged in (
        ["asset_tag+", "a\0b", 1],
        ["asset_tag+", "\ud800", 1],
        ["asset_tag+", "a", 2**70],
        ["asset_tag+", "a", True],
        ["asset_tag+", 1, 1],
        ["asset_tag+"],
        {"a": 1},
    ):
        text = base64.urlsafe_b64encode(json.dumps(forged).encode()).decode().rstrip("=")
        assert_problem(filled.get(f"{LASERS}?cursor={text}"), 422, "cursor")
    cursor = filled.ok(filled.get(f"{LASERS}?limit=1"))["next"]
    assert_problem(filled.get(f"{LASERS}?sort=distance&cursor={cursor}"), 422, "cursor")


def test_overview_counts(filled: Web) -> None:
    every = walk(filled, "", 500)
    found = filled.ok(filled.get("/api/v1/overview"))
    assert found["in_use"] == 12
    assert found["by_status"] == {"draft": 12}
    assert sum(found["by_class"].values()) == 12
    assert found["overdue"] == sum(bool(x["overdue"]) for x in every)
    assert found["no_review"] == 4
    assert found["unbounded"] == 1
    assert found["stale"] == 0
    need = [x["asset_tag"] for x in every if x["optical_density"]]
    assert [x["asset_tag"] for x in found["eyewear"]["without"]] == need
