"""The one error shape (RFC 9457 and contract v1), asserted in one place."""

from __future__ import annotations

import re
from typing import Any

import httpx

from tests.web.client import strict_json

__all__ = ["assert_problem"]

MEDIA = "application/problem+json"
KEYS = {"type", "title", "status", "detail", "errors"}
ERROR_KEYS = {"field", "value", "allowed", "message", "remedy"}
#: Traces of the inside that no answer may show.
INSIDE = re.compile(r"Traceback|File \\?\"|site-packages|\.py\b|0x[0-9a-f]{6}")
#: Bare tokens that are no JSON.
NO_JSON = re.compile(r"(?<![\w\"'])-?(NaN|Infinity)\b")


def assert_problem(response: httpx.Response, status: int, field: str | None = None) -> dict[str, Any]:
    """The problem document of a refused request; `field` must be among its errors, None: no field."""
    assert response.status_code == status, response.text[:500]
    assert response.headers["content-type"] == MEDIA
    assert not INSIDE.search(response.text), response.text[:500]
    assert not NO_JSON.search(response.text), response.text[:500]
    document: dict[str, Any] = strict_json(response.text)
    assert set(document) == KEYS
    assert document["status"] == status
    for key in ("type", "title", "detail"):
        assert isinstance(document[key], str)
        assert document[key].strip()
    assert re.fullmatch(r"/problems/[a-z-]+", document["type"])
    fields = [_checked(error) for error in document["errors"]]
    if field is None:
        assert fields == []
    else:
        assert field in fields, fields
        assert document["detail"].startswith(fields[0]), "the detail names the first field"
    return document


def _checked(error: dict[str, Any]) -> str:
    """One error has every part; values are short and flat. Returns its field."""
    assert set(error) == ERROR_KEYS
    for key in ("field", "allowed", "message", "remedy"):
        assert isinstance(error[key], str)
        assert error[key].strip(), f"{key} is empty in {error}"
    assert error["value"] is None or isinstance(error["value"], bool | int | float | str)
    if isinstance(error["value"], str):
        assert len(error["value"]) <= 130
    return str(error["field"])
