"""Reading a JSON body: under a limit, strictly, with errors that say where."""

from __future__ import annotations

import json
from typing import Any

from pydantic import ValidationError
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

__all__ = ["read_request"]


def _no_repeats(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    """An object; a name that stands twice is refused, since one of the values would be dropped."""
    found = dict(pairs)
    if len(found) != len(pairs):
        names = [name for name, _ in pairs]
        twice = next(name for name in names if names.count(name) > 1)
        error = FieldError(
            field=twice[:100],
            value=None,
            allowed="one value",
            message="this field stands twice",
            remedy="Send each field once.",
        )
        raise InvalidRequest(f"{twice[:100]}: this field stands twice", [error])
    return found


async def read_body(request: Request) -> bytes:
    """The body. Raises BodyTooLarge beyond the service's limit, UnsupportedMedia for other types."""
    media = request.headers.get("content-type", "").partition(";")[0].strip().lower()
    if media != "application/json" and not media.endswith("+json"):
        raise UnsupportedMedia(f"content-type is {media[:100]!r}; send application/json")
    limit = request.app.state.settings.body_limit
    parts, size = [], 0
    async for chunk in request.stream():
        size += len(chunk)
        if size > limit:
            raise BodyTooLarge(f"the body is larger than {limit} bytes; send less, or several requests")
        parts.append(chunk)
    return b"".join(parts)


async def read_request(request: Request) -> EvaluationRequest:
    """The evaluation request in the body. Raises a Problem that names what is wrong."""
    body = await read_body(request)
    try:
        data = json.loads(body, object_pairs_hook=_no_repeats)
    except json.JSONDecodeError as error:
        raise MalformedBody(f"line {error.lineno}, column {error.colno}: {error.msg}") from None
    except UnicodeDecodeError:
        raise MalformedBody("the body is not UTF-8 text") from None
    except RecursionError:
        raise MalformedBody("the body is nested too deeply") from None
    except ValueError:
        raise MalformedBody("the body holds a number with too many digits") from None
    try:
        return EvaluationRequest.model_validate(data)
    except ValidationError as error:
        raise invalid_request(error) from None
