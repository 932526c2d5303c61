"""Many requests at once: NDJSON or a JSON array in, NDJSON out."""

from __future__ import annotations

import asyncio
from collections.abc import AsyncIterator, Iterator
from typing import Any, cast

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import StreamingResponse

from service.bulk.records import DETAILS, Detail, Records, body_lines
from service.contract.problem import FieldError, InvalidRequest, UnsupportedMedia
from service.contract.reading import array_items
from service.web.encoding import gzipped, read_large_body
from service.web.packed import takes_gzip

__all__ = ["LINES", "NDJSON", "router"]

router = APIRouter(prefix="/api/v1")

NDJSON = "application/x-ndjson"
#: Media types of one request per line.
LINES = (NDJSON, "application/ndjson", "application/jsonl")
#: Passes that compute at the same time; the rest of the service answers between them.
AT_ONCE = 2


@router.post(
    "/evaluate/bulk", tags=["evaluation"], summary="Evaluate many lasers", response_class=StreamingResponse
)
async def post_bulk(request: Request) -> StreamingResponse:
    """One record per request, in order, as they are ready; a closing record with counts ends the answer.

    Send one request per line (application/x-ndjson) or a JSON array (application/json), plain or gzip.
    `detail=summary` gives a few figures per laser, `detail=full` the whole answer of POST /evaluate with its
    `index`. A request that cannot be answered leaves a problem in its place and the rest goes on. An answer
    without a closing record is not complete.
    """
    detail = _detail(request)
    media = request.headers.get("content-type", "").partition(";")[0].strip().lower()
    if media not in LINES and media != "application/json":
        raise UnsupportedMedia(f"content-type is {media[:100]!r}; send {NDJSON} or application/json")
    body = await read_large_body(request, request.app.state.settings.bulk_body_limit)
    items: Iterator[Any] = body_lines(body) if media in LINES else array_items(body)
    pieces, headers = Records(items, detail).lines(), {"vary": "accept-encoding"}
    if takes_gzip(request):
        pieces, headers["content-encoding"] = gzipped(pieces), "gzip"
    answer = _off_the_loop(pieces, _passes(request.app.state))
    return StreamingResponse(answer, headers=headers, media_type=NDJSON)


def _detail(request: Request) -> Detail:
    """The detail asked for. Raises InvalidRequest for another one, and for another parameter."""
    for name, value in request.query_params.multi_items():
        if name != "detail" or value not in DETAILS:
            known = name == "detail"
            error = FieldError(
                field=name[:100],
                value=value[:100],
                allowed=", ".join(DETAILS) if known else "no such parameter",
                message="unknown detail" if known else "unknown parameter",
                remedy=f"Ask for one of {', '.join(DETAILS)}."
                if known
                else "Leave it out; there is `detail`.",
            )
            raise InvalidRequest(f"{name[:100]}: {error.message}", [error])
    return cast(Detail, request.query_params.get("detail", "summary"))


def _passes(state: Any) -> asyncio.Semaphore:
    """What holds back further passes of the application."""
    if not hasattr(state, "bulk_passes"):
        state.bulk_passes = asyncio.Semaphore(AT_ONCE)
    return cast(asyncio.Semaphore, state.bulk_passes)


async def _off_the_loop(pieces: Iterator[bytes], passes: asyncio.Semaphore) -> AsyncIterator[bytes]:
    """The pieces, each made in a thread: other requests are answered meanwhile."""
    while True:
        async with passes:
            piece = await asyncio.to_thread(next, pieces, b"")
        if not piece:
            return
        yield piece
