"""Problem documents after RFC 9457: what was wrong, where, what is allowed and what to do.

Problem
 +-- InvalidRequest   422  a field is missing, unknown or outside its range
 +-- MalformedBody    400  the body is no JSON document
 +-- BodyTooLarge     413  the body is larger than the service reads
 +-- UnsupportedMedia 415  the body is not declared as JSON
 +-- NotFound         404  no such resource
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from functools import cache
from typing import Any

from pydantic import BaseModel, Field, ValidationError

from service.contract.beam import KINDS as BEAM_KINDS
from service.contract.bench import ELEMENTS
from service.contract.request import EvaluationRequest

__all__ = [
    "BodyTooLarge",
    "FieldError",
    "InvalidRequest",
    "MalformedBody",
    "NotFound",
    "Problem",
    "ProblemDocument",
    "UnsupportedMedia",
    "invalid_request",
]

MODES = ("cw", "pulse", "train")
UNITS = {
    "nm": "nm",
    "w": "W",
    "j": "J",
    "s": "s",
    "hz": "Hz",
    "mm": "mm",
    "mrad": "mrad",
    "m": "m",
    "um": "um",
    "km": "km",
    "deg": "degrees",
    "cm2": "cm2",
    "cm3": "per cm3",
    "percent": "%",
}
SHOWN = 120
#: A document lists at most this many errors; the detail counts them all.
LISTED = 20


class FieldError(BaseModel):
    """One field that cannot be used."""

    field: str = Field(description="Path of the field, for example lines.0.wavelength_nm.")
    value: Any = Field(description="The value received; null where there was none.")
    allowed: str = Field(description="What the field may hold.")
    message: str
    remedy: str


class ProblemDocument(BaseModel):
    """The body of every error answer (application/problem+json)."""

    type: str
    title: str
    status: int
    detail: str
    errors: list[FieldError] = []


class Problem(Exception):
    """An error that the outside sees, with its document."""

    slug = "problem"
    title = "The request cannot be answered"
    status = 400

    def __init__(self, detail: str, errors: Iterable[FieldError] = ()) -> None:
        super().__init__(detail)
        self.detail = detail
        self.errors = list(errors)
        #: Headers of the answer, by name in small letters.
        self.headers: dict[str, str] = {}

    def document(self) -> ProblemDocument:
        """The document to send."""
        return ProblemDocument(
            type=f"/problems/{self.slug}",
            title=self.title,
            status=self.status,
            detail=self.detail,
            errors=self.errors,
        )


class InvalidRequest(Problem):
    """A field is missing, unknown or outside its range."""

    slug = "invalid-request"
    title = "A field of the request cannot be used"
    status = 422


class MalformedBody(Problem):
    """The body is no JSON document."""

    slug = "malformed-body"
    title = "The body is not a JSON document"
    status = 400


class BodyTooLarge(Problem):
    """The body is larger than the service reads."""

    slug = "body-too-large"
    title = "The body is too large"
    status = 413


class UnsupportedMedia(Problem):
    """The body is not declared as JSON."""

    slug = "unsupported-media"
    title = "The body is not declared as JSON"
    status = 415


class NotFound(Problem):
    """No such resource."""

    slug = "not-found"
    title = "There is nothing at this address"
    status = 404


REMEDIES = {
    "missing": "Add this field.",
    "extra_forbidden": "Remove it, or check its spelling and its place.",
    "float_type": "Give a JSON number, without quotes and without a unit.",
    "finite_number": "Give a finite number.",
    "too_short": "Add the missing part.",
    "too_long": "Send fewer, or several requests.",
}
OUTSIDE = ("greater_than", "greater_than_equal", "less_than", "less_than_equal")
PAIRS = ("diameter_mm", "divergence_mrad")
RANGE_REMEDY = "Check the unit: the name of the field ends with it."
HINTS = {
    "wavelength_nm": "Check the unit: nanometres, so 1.064 µm is 1064.",
    "pulse_s": "Check the unit: seconds, so 10 ns is 1e-8. Limits are published from 1e-13 s (100 fs) on.",
    "exposure_s": "Leave it out for the conventional duration. Limits are published from 1e-13 s to 3e4 s.",
}


@cache
def _request_schema(model: type[BaseModel]) -> dict[str, Any]:
    """JSON schema of a request."""
    return {"$defs": {}, **model.model_json_schema()}


def _kinds(node: dict[str, Any]) -> list[dict[str, Any]]:
    """The members of a union, of unions within it too; a node that is none stands alone."""
    members = node.get("oneOf") or node.get("anyOf")
    return [kind for m in members for kind in _kinds(m)] if members else [node]


def _step(node: dict[str, Any], part: str, model: type[BaseModel]) -> dict[str, Any] | None:
    """Schema of one part of a path: a field, the kind of a union, or an item of a list."""
    definitions = _request_schema(model)["$defs"]
    kinds = _kinds(node)
    if part in BEAM_KINDS and any(k.get("$ref", "").endswith(BEAM_KINDS[part]) for k in kinds):
        return dict(definitions[BEAM_KINDS[part]])
    tagged = node.get("discriminator", {}).get("mapping", {}).get(part)
    if tagged is not None:
        return dict(definitions[tagged.rpartition("/")[2]])
    for kind in kinds:
        named = definitions[kind["$ref"].rpartition("/")[2]] if "$ref" in kind else kind
        found = named.get("items") if part.isdigit() else named.get("properties", {}).get(part)
        if found is not None:
            return dict(found)
    return node if part.isdigit() else None


def _schema_at(loc: list[str], model: type[BaseModel]) -> dict[str, Any] | None:
    """JSON schema of the field at a path, kinds of unions among its parts; None where there is none."""
    node: dict[str, Any] | None = _request_schema(model)
    for part in loc:
        if node is None:
            return None
        node = _step(node, part, model)
    return node


def _numbers(schema: dict[str, Any]) -> str:
    """The range of a number, with a comma before it; nothing where there is none."""
    low = schema.get("minimum", schema.get("exclusiveMinimum"))
    high = schema.get("maximum", schema.get("exclusiveMaximum"))
    if low is None or high is None:
        return ""
    more = "above " if "exclusiveMinimum" in schema else ""
    below = "below " if "exclusiveMaximum" in schema else ""
    return f", {more}{low:g} to {below}{high:g}"


def _allowed(path: list[str], loc: list[str], model: type[BaseModel]) -> str:
    """What the field at `path` may hold, in words; `loc` is the path with the kinds of the unions."""
    name = next((p for p in reversed(path) if not p.isdigit()), "")
    if name == "mode":
        return ", ".join(MODES)
    if name == "element":
        return ", ".join(ELEMENTS)
    if name == "profile":
        return ", ".join(["gaussian", "tophat", *list(BEAM_KINDS)[1:]])
    if name == "emission":
        return "an object with mode cw, pulse or train"
    if not name:
        return "an object"
    schema = _schema_at(loc, model)
    if schema is None:
        return "no such field"
    if "anyOf" in schema:
        kinds = [s for s in schema["anyOf"] if s.get("type") != "null"]
        schema = next((s for s in kinds if s.get("type") == "number"), kinds[0])
    if "enum" in schema:
        return ", ".join(map(str, schema["enum"]))
    if schema.get("type") in ("number", "integer"):
        unit = UNITS.get(name.rsplit("_", 1)[-1], "")
        pair = ", or a list of two" if name in PAIRS else ""
        kind = "a number" if schema["type"] == "number" else "a whole number"
        return f"{kind}{_numbers(schema)} {unit}".rstrip() + pair
    if schema.get("type") == "array":
        low, high = schema.get("minItems", 0), schema["maxItems"]
        return f"a list of {low} to {high} items"
    if schema.get("type") == "string":
        return f"text of at most {schema['maxLength']} characters"
    return "true or false" if schema.get("type") == "boolean" else "an object"


def shown(value: Any) -> Any:
    """A received value as it may be sent back: finite, short, never nested."""
    if value is None or isinstance(value, bool):
        return value
    if isinstance(value, int | float):
        fits = abs(value) < 1e300 if isinstance(value, int) else math.isfinite(value)
        return value if fits else str(value)[:SHOWN]
    if isinstance(value, str):
        return value if len(value) <= SHOWN else value[:SHOWN] + "..."
    if isinstance(value, list | tuple):
        return f"a list of {len(value)} items"
    return "an object" if isinstance(value, dict) else type(value).__name__


def _path(loc: tuple[int | str, ...]) -> list[str]:
    """Path of a field as the sender knows it: without the tags of the unions."""
    parts = [str(p) for p in loc]
    path = []
    for k, part in enumerate(parts):
        before, earlier = parts[k - 1] if k else "", parts[k - 2] if k > 1 else ""
        tagged = (
            (before == "emission" and part in MODES)
            or (before == "beam" and part in BEAM_KINDS)
            or (earlier == "bench" and part in ELEMENTS)
        )
        if not tagged:
            path.append(part)
    return path


def _own_words(message: str) -> str:
    """A message without its prefix; the small first letter that continues a line, the rest as written."""
    own = message.removeprefix("Value error, ")
    return own if own != message else own[:1].lower() + own[1:]


def _one_for_both_axes(errors: list[FieldError]) -> list[FieldError]:
    """A number that stands for both axes is named once, without the axis."""
    fields = {e.field: e for e in errors}
    kept = []
    for e in errors:
        stem, _, axis = e.field.rpartition(".")
        twin = fields.get(f"{stem}.{1 - int(axis)}") if axis in ("0", "1") else None
        if twin is None or stem.rpartition(".")[2] not in PAIRS or twin.value != e.value:
            kept.append(e)
        elif axis == "0":
            kept.append(e.model_copy(update={"field": stem}))
    return kept


def invalid_request(error: ValidationError, model: type[BaseModel] = EvaluationRequest) -> InvalidRequest:
    """The problem for a request that failed validation."""
    errors = []
    for item in error.errors(include_url=False)[: 4 * LISTED]:
        kind, path, loc = item["type"], _path(item["loc"]), [str(p) for p in item["loc"]]
        if kind in ("union_tag_invalid", "union_tag_not_found"):
            path.append("element" if "bench" in path else "mode")
        if kind == "value_error" and path[-1:] == ["beam"]:
            path.append("diameter_mm")
            loc.append("diameter_mm")
        name = next((p for p in reversed(path) if not p.isdigit()), "")
        given = item["input"]
        if kind in ("missing", "union_tag_not_found"):
            value, message = None, "this field is missing"
        elif kind == "union_tag_invalid":
            value = given.get(path[-1]) if isinstance(given, dict) else given
            message = f"unknown {path[-1]}"
        elif kind == "extra_forbidden":
            value, message = given, "unknown field"
        elif kind in ("model_type", "model_attributes_type", "dict_type", "union_tag_not_found"):
            value, message = given, "not a JSON object"
        elif kind == "list_type":
            value, message = given, "not a list"
        elif kind in OUTSIDE:
            value, message = given, "outside the allowed range"
        elif isinstance(given, list | tuple) and name in PAIRS:
            value, message = given, "neither a number nor a list of two numbers"
        else:
            value, message = given, _own_words(item["msg"])
        remedy = REMEDIES.get(kind, RANGE_REMEDY if kind in OUTSIDE else "Correct it.")
        if kind not in ("missing", "extra_forbidden", "float_type", "finite_number"):
            remedy = HINTS.get(name, remedy)
        if kind == "value_error" and name == "diameter_mm":
            value, remedy = None, "Check diameter, divergence and waist, and where the diameter was measured."
        errors.append(
            FieldError(
                field=(".".join(path) or "body")[:SHOWN],
                value=shown(value),
                allowed="no such field" if kind == "extra_forbidden" else _allowed(path, loc, model),
                message=message,
                remedy=remedy,
            )
        )
    errors = _one_for_both_axes(errors)[:LISTED]
    first = errors[0]
    more = f" ({error.error_count() - 1} more)" if error.error_count() > 1 else ""
    return InvalidRequest(f"{first.field}: {first.message}{more}", errors)
