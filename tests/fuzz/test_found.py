"""Requests that generated ones brought to light."""

from __future__ import annotations

from typing import Any

import pytest

from tests.web.client import EVALUATE, Client, changed
from tests.web.shape import assert_problem


@pytest.mark.parametrize("surfaces", [0, 3, -11262, 1.5, "2", None, [], {}])
def test_a_choice_among_numbers_is_named(client: Client, surfaces: Any) -> None:
    bench = [{"element": "reflector", "refractive_index": 1.5, "surfaces": surfaces}]
    document = assert_problem(client.post(EVALUATE, json=changed("bench", bench)), 422, "bench.0.surfaces")
    assert document["errors"][0]["allowed"] == "1, 2"


@pytest.mark.parametrize("profile", [[], {}, ["tophat"], 7, None, True])
def test_a_profile_of_the_wrong_kind_is_named(client: Client, profile: Any) -> None:
    body = changed("lines.0.beam.profile", profile)
    assert_problem(client.post(EVALUATE, json=body), 422, "lines.0.beam.profile")
