"""Bodies that hold an evaluation request beside fields of their own: one error shape for both."""

from __future__ import annotations

from typing import Any, TypeVar

from pydantic import BaseModel, ValidationError

from service.contract.problem import FieldError, InvalidRequest, shown
from service.contract.reading import request_of

__all__ = ["enclosed"]

M = TypeVar("M", bound=BaseModel)

#: A document lists at most this many errors.
LISTED = 20
OUTSIDE = ("greater_than", "greater_than_equal", "less_than", "less_than_equal")
MESSAGES = {
    "missing": ("this field is missing", "Add this field."),
    "extra_forbidden": ("unknown field", "Remove it, or check its spelling and its place."),
    "literal_error": ("unknown choice", "Choose one of those listed."),
}


def enclosed(data: Any, model: type[M]) -> M:
    """The body as `model`, whose field `evaluation` is an evaluation request.

    Raises InvalidRequest that names every field in error; fields of the request as `evaluation.lines...`.
    """
    if isinstance(data, dict) and "evaluation" in data:
        try:
            data = {**data, "evaluation": request_of(data["evaluation"])}
        except InvalidRequest as problem:
            errors = [
                e.model_copy(update={"field": f"evaluation.{e.field}".removesuffix(".body")})
                for e in problem.errors
            ]
            raise InvalidRequest(f"evaluation.{problem.detail}", errors) from None
    try:
        return model.model_validate(data)
    except ValidationError as error:
        errors = [_field_error(item, model) for item in error.errors(include_url=False)[:LISTED]]
        more = f" ({error.error_count() - 1} more)" if error.error_count() > 1 else ""
        raise InvalidRequest(f"{errors[0].field}: {errors[0].message}{more}", errors) from None


def _field_error(item: Any, model: type[BaseModel]) -> FieldError:
    """One error of the validation in the words of the contract."""
    path = [str(p) for p in item["loc"]]
    kind, given = item["type"], item["input"]
    if kind in MESSAGES:
        message, remedy = MESSAGES[kind]
    elif kind in OUTSIDE:
        message, remedy = "outside the allowed range", "Choose a value in the range."
    else:
        message, remedy = item["msg"].removeprefix("Value error, "), "Correct it."
        message = message[:1].lower() + message[1:]
    return FieldError(
        field=(".".join(path) or "body")[:100],
        value=None if kind == "missing" else shown(given),
        allowed="no such field" if kind == "extra_forbidden" else _allowed(path, model),
        message=message,
        remedy=remedy,
    )


def _allowed(path: list[str], model: type[BaseModel]) -> str:
    """What a field may hold, from the schema of the model."""
    schema = model.model_json_schema()
    place: dict[str, Any] = schema
    for name in path:
        while "$ref" in place:
            place = schema["$defs"][place["$ref"].rpartition("/")[2]]
        place = place.get("properties", {}).get(name, {})
    if "enum" in place:
        return ", ".join(map(str, place["enum"]))
    if place.get("type") in ("number", "integer"):
        kind = "a whole number" if place["type"] == "integer" else "a number"
        ends = f", {place['minimum']:g} to {place['maximum']:g}" if "minimum" in place else ""
        return kind + ends
    return "an object"
