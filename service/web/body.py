"""Reading a JSON body: under a limit, strictly, with errors that say where."""

from __future__ import annotations

from typing import Any, TypeVar

from pydantic import BaseModel
from starlette.requests import Request

from service.contract.problem import BodyTooLarge, UnsupportedMedia
from service.contract.reading import model_of, read_json
from service.contract.request import EvaluationRequest

__all__ = ["read_data", "read_limited", "read_model", "read_request"]

Read = TypeVar("Read", bound=BaseModel)


async def read_limited(request: Request, limit: int) -> bytes:
    """The body. Raises BodyTooLarge beyond a limit [bytes]."""
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


async def read_model(request: Request, model: type[Read], image: bool = False) -> Read:
    """The request of some kind in the body; `image` says that it may carry one. Raises a Problem."""
    return model_of(model, await read_data(request, image=image))


async def read_data(request: Request, *, image: bool = False) -> Any:
    """The JSON value in the body; `image` says that it may carry one. Raises a Problem."""
    media = request.headers.get("content-type", "").partition(";")[0].strip().lower()
    if media != "application/json" and not media.endswith("+json"):
        raise UnsupportedMedia(f"content-type is {media[:100]!r}; send application/json")
    settings = request.app.state.settings
    return read_json(await read_limited(request, settings.image_limit if image else settings.body_limit))
