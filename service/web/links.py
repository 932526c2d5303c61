"""Evaluations as addresses of pages."""

from __future__ import annotations

from typing import Any

from service.contract.reading import request_of
from service.web.filled import form_of

__all__ = ["address_of"]


def address_of(evaluation: dict[str, Any], page: str = "/evaluate", more: str = "") -> str:
    """Address of a page for an evaluation (a body as JSON); the blank form where it cannot hold that."""
    form = form_of(request_of(evaluation))
    return "/" if form is None else f"{page}?{form.query()}{more}"
