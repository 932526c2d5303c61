"""A typed client of the API: synchronous and asynchronous, with retries and typed problems.

    with Client("http://127.0.0.1:8321") as blinkline:
        laser, done = blinkline.upsert({"asset_tag": "BL-001", "request": {...}})
        print(done, laser.hazard_class, laser.eye_hazard_distance_m)

Needs httpx (the extra `client`). Lost connections, 429 and 503 are tried again with growing pauses
where that cannot do anything twice. Errors:

    ClientError
     +-- Unreachable        no answer, after every retry
     +-- ProblemError       the service refused; `problem` is its document
          +-- NotAllowed    401, 403
          +-- Missing       404
          +-- InConflict    409
          +-- Stale         412, 428
          +-- Invalid       422
          +-- Busy          429, 503, after every retry
"""

from __future__ import annotations

from service.client.asynchronous import AsyncClient
from service.client.calls import (
    Busy,
    ClientError,
    Done,
    InConflict,
    Invalid,
    Missing,
    NotAllowed,
    ProblemError,
    Stale,
    Unreachable,
)
from service.client.synchronous import Client

__all__ = [
    "AsyncClient",
    "Busy",
    "Client",
    "ClientError",
    "Done",
    "InConflict",
    "Invalid",
    "Missing",
    "NotAllowed",
    "ProblemError",
    "Stale",
    "Unreachable",
]
