"""Static files with a content hash in their address, so that they may be kept for ever."""

from __future__ import annotations

import hashlib
from functools import cache

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import Response

from service.contract.problem import NotFound
from service.files import STATIC
from service.web.packed import packed

__all__ = ["router", "static_address"]

router = APIRouter(include_in_schema=False)

TYPES = {".css": "text/css; charset=utf-8", ".svg": "image/svg+xml", ".js": "text/javascript; charset=utf-8"}


@cache
def _files() -> dict[str, tuple[bytes, str, str]]:
    """Content, media type and hash of every static file by name."""
    files = {}
    for path in sorted(STATIC.iterdir()):
        if path.suffix in TYPES:
            content = path.read_bytes()
            files[path.name] = content, TYPES[path.suffix], hashlib.sha256(content).hexdigest()[:16]
    return files


def static_address(name: str) -> str:
    """Address of a static file. Raises KeyError where there is none."""
    return f"/static/{name}?h={_files()[name][2]}"


@router.get("/static/{name}")
async def static_file(request: Request, name: str) -> Response:
    """One static file."""
    found = _files().get(name)
    if found is None:
        raise NotFound(f"there is no static file {name!r}")
    content, media, digest = found
    headers = {"cache-control": "public, max-age=31536000, immutable", "etag": f'"{digest}"'}
    content, how = packed(request, content)
    return Response(content, media_type=media, headers={**headers, **how})


@router.get("/favicon.ico")
async def favicon() -> Response:
    """The mark of the service."""
    content, media, _ = _files()["mark.svg"]
    return Response(content, media_type=media, headers={"cache-control": "public, max-age=86400"})
