"""Reading a JSON body: under a limit, strictly, with errors that say where."""

from __future__ import annotations

import json
import math
from typing import Any, TypeVar

from pydantic import BaseModel, ValidationError
from starlette.requests import Request

from service.contract.problem import (
    BodyTooLarge,
    FieldError,
    InvalidRequest,
    MalformedBody,
    UnsupportedMedia,
    invalid_request,
)
from service.contract.request import EvaluationRequest

__all__ = ["read_model", "read_request"]

M = TypeVar("M", bound=BaseModel)

#: Integers with more digits than any double holds are read as infinite, and refused by their field.
MAX_DIGITS = 400


class _Repeated(dict[str, Any]):
    """An object in which a name stood twice: one of the two values would be lost."""

    name = ""


def _object(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) == len(pairs):
        return found
    seen: set[str] = set()
    repeated = _Repeated(found)
    for name, _ in pairs:
        if name in seen:
            repeated.name = name
        seen.add(name)
    return repeated


def _integer(text: str) -> int | float:
    return int(text) if len(text) <= MAX_DIGITS else math.copysign(math.inf, -1 if text[0] == "-" else 1)


def _check(data: Any) -> None:
    """Refuse repeated names, with their place, and halves of characters."""
    todo: list[tuple[str, Any]] = [("", data)]
    while todo:
        path, value = todo.pop()
        if isinstance(value, _Repeated):
            field = f"{path}{value.name}"[:100]
            error = FieldError(
                field=field,
                value=None,
                allowed="one value",
                message="this field stands twice",
                remedy="Send each field once.",
            )
            raise InvalidRequest(f"{field}: this field stands twice", [error])
        if isinstance(value, dict):
            todo += [("", name) for name in value]
            todo += [(f"{path}{name}.", inner) for name, inner in value.items()]
        elif isinstance(value, list):
            todo += [(f"{path}{n}.", inner) for n, inner in enumerate(value)]
        elif isinstance(value, str) and not value.isascii():
            try:
                value.encode()
            except UnicodeEncodeError:
                raise MalformedBody("the body holds half of a character (a lone surrogate)") from None


async def _read_body(request: Request, limit: int) -> bytes:
    """The body. Raises BodyTooLarge beyond the limit [bytes], UnsupportedMedia for other types."""
    media = request.headers.get("content-type", "").partition(";")[0].strip().lower()
    if media != "application/json" and not media.endswith("+json"):
        raise UnsupportedMedia(f"content-type is {media[:100]!r}; send application/json")
    parts, size = [], 0
    async for chunk in request.stream():
        size += len(chunk)
        if size > limit:
            raise BodyTooLarge(f"the body is larger than {limit} bytes; send less, or several requests")
        parts.append(chunk)
    return b"".join(parts)


async def read_request(request: Request) -> EvaluationRequest:
    """The evaluation request in the body. Raises a Problem that names what is wrong."""
    return await read_model(request, EvaluationRequest)


async def read_model(request: Request, model: type[M], image: bool = False) -> M:
    """The body as a request of this model, which may carry an image. Raises a Problem."""
    settings = request.app.state.settings
    body = await _read_body(request, settings.image_limit if image else settings.body_limit)
    try:
        data = json.loads(body.decode(), object_pairs_hook=_object, parse_int=_integer)
        _check(data)
    except json.JSONDecodeError as error:
        raise MalformedBody(f"line {error.lineno}, column {error.colno}: {error.msg}") from None
    except UnicodeDecodeError:
        raise MalformedBody("the body is not UTF-8 text") from None
    except RecursionError:
        raise MalformedBody("the body is nested too deeply") from None
    try:
        return model.model_validate(data)
    except ValidationError as error:
        raise invalid_request(error, model) from None
