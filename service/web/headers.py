"""What every answer passes: security headers, HEAD as GET, and failures as problems."""

from __future__ import annotations

import logging
from collections.abc import Callable

from starlette.requests import Request
from starlette.responses import Response
from starlette.types import ASGIApp, Message, Receive, Scope, Send

__all__ = ["Envelope"]

POLICY = (
    "default-src 'none'; style-src 'self'; script-src 'self'; img-src 'self'; connect-src 'self'; "
    "form-action 'self'; base-uri 'none'; frame-ancestors 'none'"
)
HEADERS = (
    (b"content-security-policy", POLICY.encode()),
    (b"x-content-type-options", b"nosniff"),
    (b"referrer-policy", b"no-referrer"),
    (b"cross-origin-opener-policy", b"same-origin"),
    (b"permissions-policy", b"camera=(), geolocation=(), microphone=()"),
)
LOG = logging.getLogger("blinkline")


class Envelope:
    """Adds the headers, answers HEAD as GET without a body, turns a failure into a problem.

    Nothing may be loaded from elsewhere and nothing inline runs; no trace of a failure leaves.
    """

    def __init__(self, app: ASGIApp, on_failure: Callable[[Request], Response]) -> None:
        self.app, self.on_failure = app, on_failure

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Pass the request on."""
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return
        head = scope["method"] == "HEAD"
        started = False

        async def sealed(message: Message) -> None:
            nonlocal started
            if message["type"] == "http.response.start":
                started = True
                message = {**message, "headers": [*message.get("headers", ()), *HEADERS]}
            elif head:
                message = {**message, "body": b""}
            await send(message)

        try:
            await self.app({**scope, "method": "GET"} if head else scope, receive, sealed)
        except Exception:
            LOG.exception("request failed: %s %s", scope["method"], scope["path"])
            if started:
                raise
            await self.on_failure(Request(scope, receive))(scope, receive, sealed)
