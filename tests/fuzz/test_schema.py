"""Every operation of the OpenAPI document under generated requests, a bounded number in every run."""

from __future__ import annotations

from typing import Any

import pytest

from tests.fuzz.schema import MODES, operations, send_many
from tests.web.client import Client

COUNT = {"post": 40, "put": 10, "delete": 4, "get": 8}


@pytest.mark.parametrize("mode", MODES, ids=[m.value for m in MODES])
@pytest.mark.parametrize("operation", operations(), ids=lambda o: o.label)
def test_answers_are_sound(client: Client, operation: Any, mode: Any) -> None:
    statuses = send_many(client, operation, mode, COUNT[operation.method], 1)
    # A bulk body answers each bad line with a problem in its place.
    if mode is MODES[1] and operation.method in ("post", "put") and not operation.path.endswith("/bulk"):
        assert not any(status < 300 for status in statuses), statuses
