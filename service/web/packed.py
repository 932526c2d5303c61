"""Pages and static files in gzip, for clients that take it."""

from __future__ import annotations

import gzip
import re

from starlette.requests import Request

__all__ = ["packed", "takes_gzip"]

#: Below this many bytes packing gains nothing.
LEAST = 1000
#: Small enough and quick: a result page takes about two milliseconds.
LEVEL = 5
NOT_WANTED = re.compile(r"q *= *0(\.0*)?")


def takes_gzip(request: Request) -> bool:
    """Whether the client takes an answer in gzip."""
    for part in request.headers.get("accept-encoding", "").split(","):
        name, *parameters = (p.strip().lower() for p in part.split(";"))
        if name in ("gzip", "*"):
            return not any(NOT_WANTED.fullmatch(p) for p in parameters)
    return False


def packed(request: Request, content: bytes) -> tuple[bytes, dict[str, str]]:
    """The content as it goes over the wire, and the headers that say so."""
    vary = {"vary": "accept-encoding"}
    if len(content) < LEAST or not takes_gzip(request):
        return content, vary
    return gzip.compress(content, LEVEL, mtime=0), {**vary, "content-encoding": "gzip"}
