"""gzip of large bodies, in and out, in pieces and under a limit."""

from __future__ import annotations

import zlib
from collections.abc import Iterator

from starlette.requests import Request

from service.contract.problem import BodyTooLarge, MalformedBody, UnsupportedMedia

__all__ = ["gzipped", "read_large_body"]

GZIP = 16 + zlib.MAX_WBITS
#: Fast rather than small: the lines of an answer are much alike.
LEVEL = 1


async def read_large_body(request: Request, limit: int) -> bytearray:
    """The body, unpacked where it is gzip.

    Raises BodyTooLarge where it is larger than `limit` bytes once unpacked, MalformedBody where it cannot be
    unpacked, UnsupportedMedia for another encoding.
    """
    encoding = request.headers.get("content-encoding", "identity").strip().lower()
    if encoding not in ("identity", "gzip"):
        raise UnsupportedMedia(f"content-encoding is {encoding[:100]!r}; send gzip, or none")
    body = bytearray()
    unpacker = zlib.decompressobj(GZIP) if encoding == "gzip" else None
    async for piece in request.stream():
        if unpacker is None:
            body += piece
        else:
            unpacker = _unpack(unpacker, piece, body, limit)
        if len(body) > limit:
            raise BodyTooLarge(f"the body is larger than {limit} bytes; send less, or several requests")
    if unpacker is not None and not unpacker.eof:
        raise MalformedBody("the body is no complete gzip stream")
    return body


def _unpack(unpacker: zlib._Decompress, piece: bytes, body: bytearray, limit: int) -> zlib._Decompress:
    """Unpack a piece onto the body, at most one byte beyond the limit; several streams may follow."""
    try:
        while piece and len(body) <= limit:
            if unpacker.eof:
                unpacker = zlib.decompressobj(GZIP)
            body += unpacker.decompress(piece, limit + 1 - len(body))
            piece = unpacker.unconsumed_tail or unpacker.unused_data
    except zlib.error:
        raise MalformedBody("the body is no gzip stream") from None
    return unpacker


def gzipped(pieces: Iterator[bytes]) -> Iterator[bytes]:
    """The same pieces in gzip, each complete for the reader as it arrives."""
    packer = zlib.compressobj(LEVEL, wbits=GZIP)
    for piece in pieces:
        yield packer.compress(piece) + packer.flush(zlib.Z_SYNC_FLUSH)
    yield packer.flush()
