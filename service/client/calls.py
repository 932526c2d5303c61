"""Calls of the client: what is sent, how answers are read, which failures there are."""

from __future__ import annotations

import json
import random
import uuid
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any, Generic, Literal, TypeVar

import httpx
from pydantic import BaseModel, TypeAdapter

from service.contract.evaluation import EvaluationResult
from service.contract.problem import ProblemDocument
from service.register.importing import Imported
from service.register.matching import PairMatch
from service.register.models import (
    EyewearRecord,
    Laser,
    LaserPage,
    LaserSummary,
    Revision,
)

__all__ = [
    "Body",
    "Busy",
    "Call",
    "ClientError",
    "Done",
    "InConflict",
    "Invalid",
    "Missing",
    "NotAllowed",
    "ProblemError",
    "Shared",
    "Stale",
    "Unreachable",
    "change",
    "create",
    "evaluate",
    "eyewear_for",
    "import_csv",
    "laser_of",
    "lasers_page",
    "merged",
    "pause",
    "put_on_shelf",
    "revisions_of",
    "step",
    "tag_of",
]

T = TypeVar("T")
Done = Literal["created", "changed", "unchanged"]
Body = BaseModel | Mapping[str, Any]
#: First pause and longest pause between tries [s].
PAUSE_S, LONGEST_S = 0.2, 10.0


class ClientError(Exception):
    """Any failure of a call."""


class Unreachable(ClientError):
    """No answer, after every retry."""


class ProblemError(ClientError):
    """The service refused; `problem` is its document."""

    def __init__(self, problem: ProblemDocument) -> None:
        super().__init__(f"{problem.status} {problem.title}: {problem.detail}")
        self.problem = problem


class NotAllowed(ProblemError):
    """Sign-in, role or scope do not suffice."""


class Missing(ProblemError):
    """There is no such record."""


class InConflict(ProblemError):
    """It does not go with the state of the record."""


class Stale(ProblemError):
    """Somebody else changed the record in the meantime."""


class Invalid(ProblemError):
    """A field cannot be used; `problem.errors` names each."""


class Busy(ProblemError):
    """The service could not answer now, after every retry."""


KINDS: dict[int, type[ProblemError]] = {
    401: NotAllowed,
    403: NotAllowed,
    404: Missing,
    409: InConflict,
    412: Stale,
    428: Stale,
    422: Invalid,
    429: Busy,
    503: Busy,
}


@dataclass(frozen=True)
class Call(Generic[T]):
    """One call: what is sent, how the answer is read, whether it may be tried again."""

    method: str
    path: str
    read: Callable[[httpx.Response], T]
    content: str | bytes | None = None
    headers: dict[str, str] = field(default_factory=dict)
    params: dict[str, str] = field(default_factory=dict)
    again: bool = True


def _plain(body: Body) -> dict[str, Any]:
    return body.model_dump(mode="json") if isinstance(body, BaseModel) else dict(body)


def _read(model: type[T]) -> Callable[[httpx.Response], T]:
    adapter: TypeAdapter[T] = TypeAdapter(model)
    return lambda response: adapter.validate_json(response.content)


JSON = {"content-type": "application/json"}


def _get(path: str, model: Any, **params: Any) -> Call[Any]:
    given = {k: str(v).lower() if isinstance(v, bool) else str(v) for k, v in params.items() if v is not None}
    return Call("GET", path, _read(model), params=given)


def _send(method: str, path: str, model: Any, body: Body, again: bool, **headers: str) -> Call[Any]:
    named = {k.replace("_", "-"): v for k, v in headers.items()}
    return Call(method, path, _read(model), json.dumps(_plain(body)), {**JSON, **named}, again=again)


def _etag(laser: LaserSummary) -> str:
    return f'"laser-{laser.id}-{laser.version}"'


def create(body: Body) -> Call[Laser]:
    """Store a laser; a retry does it once."""
    return _send("POST", "/api/v1/lasers", Laser, body, True, idempotency_key=str(uuid.uuid4()))


def change(laser: LaserSummary, body: Body) -> Call[Laser]:
    """Replace a laser as it was read."""
    return _send("PUT", f"/api/v1/lasers/{laser.id}", Laser, body, False, if_match=_etag(laser))


def step(laser: LaserSummary, step: str, comment: str, review_due: str | None) -> Call[Laser]:
    """A step of the sign-off of the current revision."""
    path = f"/api/v1/lasers/{laser.id}/revisions/{laser.revision}/{step}"
    body = {"comment": comment, "review_due": review_due}
    return _send("POST", path, Laser, body, False, if_match=_etag(laser))


def import_csv(data: bytes, check_only: bool) -> Call[Imported]:
    """Import a CSV file."""
    params = {"check_only": str(check_only).lower()}
    headers = {"content-type": "text/csv"}
    return Call("POST", "/api/v1/lasers/import", _read(Imported), data, headers, params, again=True)


def evaluate(request: Body) -> Call[EvaluationResult]:
    """Evaluate one request."""
    return _send("POST", "/api/v1/evaluate", EvaluationResult, request, True)


def lasers_page(cursor: str | None, filters: Mapping[str, str | bool]) -> Call[LaserPage]:
    """One page of a list."""
    return _get("/api/v1/lasers", LaserPage, limit=200, cursor=cursor, **filters)


def laser_of(laser_id: int) -> Call[Laser]:
    """One laser."""
    return _get(f"/api/v1/lasers/{laser_id}", Laser)


def revisions_of(laser_id: int) -> Call[list[Revision]]:
    """The history of a laser."""
    return _get(f"/api/v1/lasers/{laser_id}/revisions", list[Revision])


def eyewear_for(laser_id: int) -> Call[list[PairMatch]]:
    """Pairs on the shelf against a laser."""
    return _get(f"/api/v1/lasers/{laser_id}/eyewear", list[PairMatch])


def put_on_shelf(body: Body) -> Call[EyewearRecord]:
    """Put a pair on the shelf; a retry does it once."""
    key = str(uuid.uuid4())
    return _send("POST", "/api/v1/eyewear", EyewearRecord, body, True, idempotency_key=key)


def tag_of(body: Body) -> str:
    """The asset tag of a laser to be sent."""
    return str(_plain(body)["asset_tag"]).strip()


def merged(found: LaserSummary, body: Body) -> dict[str, Any]:
    """A change that keeps what it does not name."""
    given = body.model_dump(mode="json", exclude_unset=True) if isinstance(body, BaseModel) else dict(body)
    kept = {n: getattr(found, n) for n in ("label", "place", "owner", "manufacturer", "review_due")}
    return {**kept, **given}


def pause(tries: int, response: httpx.Response | None) -> float:
    """Seconds until the next try: what the service asks for, or longer each time, a little at random."""
    asked = response.headers.get("retry-after", "") if response is not None else ""
    if asked.isdecimal():
        return min(float(asked), LONGEST_S)
    return min(PAUSE_S * 2.0**tries, LONGEST_S) * (0.5 + random.random() / 2.0)


def _refused(response: httpx.Response) -> ProblemError:
    try:
        problem = ProblemDocument.model_validate_json(response.content)
    except ValueError:
        problem = ProblemDocument(
            type="/problems/http",
            title="The service answered with something else than a problem document",
            status=response.status_code,
            detail=response.text[:200],
        )
    return KINDS.get(response.status_code, ProblemError)(problem)


class Shared:
    """What both clients share."""

    def __init__(self, base_url: str, token: str | None, retries: int, timeout_s: float) -> None:
        self.retries = retries
        self.options: dict[str, Any] = {
            "base_url": base_url,
            "timeout": timeout_s,
            "headers": {"authorization": f"Bearer {token}"} if token else {},
        }

    def after(self, call: Call[Any], response: httpx.Response, tries: int) -> bool:
        """Whether to try again. Raises ProblemError for a refusal."""
        if response.status_code < 400:
            return False
        # 429 and 503 say that nothing was done; a proxy's 502 or 504 leaves it open.
        undone = response.status_code in (429, 503) or (call.again and response.status_code in (502, 504))
        if undone and tries < self.retries:
            return True
        raise _refused(response)

    def lost(self, call: Call[Any], error: httpx.TransportError, tries: int) -> None:
        """Raises Unreachable where a lost connection cannot be tried again."""
        unsent = isinstance(error, httpx.ConnectError | httpx.ConnectTimeout | httpx.PoolTimeout)
        if tries >= self.retries or not (call.again or unsent):
            raise Unreachable(f"{call.method} {call.path}: {error or type(error).__name__}") from error
