"""Something odd in every place of a full request: always an answer or a problem document, never a failure."""

from __future__ import annotations

import copy
import json
from collections.abc import Iterator
from typing import Any

import pytest

from tests.fuzz.schema import answer_is_sound
from tests.web.client import EVALUATE, GOOD, JSON, Client

FULL: dict[str, Any] = {
    **GOOD,
    "bench": [
        {"element": "space", "length_m": 1},
        {"element": "lens", "focal_mm": 100, "transmittance": 1},
        {"element": "mirror", "radius_mm": 100, "reflectance": 0.9, "incidence_deg": 3},
        {"element": "expander", "magnification": 2, "transmittance": 1},
        {"element": "window", "transmittance": 0.5},
        {"element": "reflector", "refractive_index": 1.5, "incidence_deg": 3, "surfaces": 2},
        {"element": "scanner", "angle_deg": 3, "sweeps_hz": 30, "motion": "even", "rows": 2, "height_deg": 3},
    ],
    "viewing": {
        "distance_m": 1,
        "visibility_km": 10,
        "aid": {"objective_mm": 50, "magnification": 7, "transmittance": 1},
        "outdoors": True,
        "over_distance": {"from_m": 1, "to_m": 10, "points": 5},
    },
    "eyewear": [
        {
            "name": "Pair",
            "ranges": [{"from_nm": 500, "to_nm": 600, "optical_density": 3, "marking": "D LB5"}],
            "luminous_transmittance": 0.5,
        }
    ],
    "windows": [{"name": "Screen", "distance_m": 1, "optical_density": 3}],
}
ODD = [None, -1e308, 5e-324, 10**400, "\ud800", [], {"a": 1}]


def places(node: Any, way: tuple[Any, ...] = ()) -> Iterator[tuple[Any, ...]]:
    """The way to every value, that to the request itself left out."""
    inner = node.items() if isinstance(node, dict) else enumerate(node) if isinstance(node, list) else ()
    for key, value in inner:
        yield (*way, key)
        yield from places(value, (*way, key))


def test_the_full_request_is_answered(client: Client) -> None:
    client.evaluate(FULL)


@pytest.mark.parametrize("odd", ODD, ids=lambda o: repr(o)[:12].encode("ascii", "replace").decode())
def test_something_odd_in_every_place(client: Client, odd: Any) -> None:
    for way in places(FULL):
        body = copy.deepcopy(FULL)
        place: Any = body
        for step in way[:-1]:
            place = place[step]
        place[way[-1]] = odd
        response = client.post(EVALUATE, content=json.dumps(body).encode(), headers=JSON)
        answer_is_sound(response, f"{odd!r:.40} at {way}")
