"""Evaluations as addresses of the form."""

from __future__ import annotations

from typing import Any

from service.web.fields import LINE_FIELDS, field_name
from service.web.form import Form
from service.web.numbers import plain

__all__ = ["evaluation_address", "form_of"]


def form_of(evaluation: dict[str, Any]) -> Form:
    """The form that stands for an evaluation without pairs, windows and bench (a body as JSON)."""
    values = {name: str(evaluation[name]) for name in ("label", "rules", "basis") if evaluation.get(name)}
    if evaluation.get("exposure_s") is not None:
        values["exposure_s"] = plain(evaluation["exposure_s"])
    distance = evaluation.get("viewing", {}).get("distance_m")
    if distance is not None:
        values["distance_m"] = plain(distance)
    for k, line in enumerate(evaluation["lines"], start=1):
        given = {**line, **line["emission"], **line["beam"]}
        for name, other in (("diameter_mm", "diameter_y_mm"), ("divergence_mrad", "divergence_y_mrad")):
            if isinstance(given.get(name), list | tuple):
                given[name], given[other] = given[name]
        for name in LINE_FIELDS:
            value = given.get(name)
            if value is not None:
                text = value if isinstance(value, str) else plain(float(value))
                values[field_name(name, k)] = text
    form = Form(values)
    form.counts["lines"] = len(evaluation["lines"])
    return form


def evaluation_address(evaluation: dict[str, Any]) -> str:
    """Address of the page that evaluates this body."""
    return f"/evaluate?{form_of(evaluation).query()}"
