"""What a request must pass before it is read: known host, fair rate, room to compute, a body in good time."""

from __future__ import annotations

import asyncio
import time
from collections.abc import Callable

from starlette.requests import ClientDisconnect, Request
from starlette.responses import Response
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from service.contract.problem import Problem
from service.settings import Settings
from service.web.peers import peer_of

__all__ = ["BodyTooSlow", "Guard", "Overloaded", "TooManyRequests", "UnknownHost"]

#: After a refusal for want of room, come back in so many seconds.
RETRY_S = 1
#: A body that comes at this pace or faster may take longer than the time limit [bytes/s].
STEADY = 100_000
#: Most clients whose rates are kept; beyond, those that have been quiet longest are forgotten.
MOST_CLIENTS = 10_000
#: Probes and counts must be answered when nothing else is, and by the address of the container.
OPERATION = ("/health/", "/metrics")


class UnknownHost(Problem):
    """The request names a host that this service does not serve."""

    slug = "unknown-host"
    title = "This host is not served here"
    status = 421


class TooManyRequests(Problem):
    """A client asks more often than the operator allows."""

    slug = "too-many-requests"
    title = "Too many requests"
    status = 429

    def __init__(self, wait_s: int) -> None:
        super().__init__(f"this address asks too often; ask again in {wait_s} s")
        self.headers = {"retry-after": str(wait_s)}


class Overloaded(Problem):
    """More requests are computed than the operator allows."""

    slug = "overloaded"
    title = "The service has more to do than it can"
    status = 503

    def __init__(self, room: int) -> None:
        super().__init__(f"{room} requests are being computed already; ask again in {RETRY_S} s")
        self.headers = {"retry-after": str(RETRY_S)}


class BodyTooSlow(Problem):
    """The body did not arrive in time."""

    slug = "body-too-slow"
    title = "The body did not arrive in time"
    status = 408

    def __init__(self, patience_s: float) -> None:
        super().__init__(f"the body did not arrive within {patience_s:g} s")
        self.headers = {"connection": "close"}


class _Rates:
    """A bucket per client: `rate` requests a minute on average, at most a quarter of them at once."""

    def __init__(self, rate: int) -> None:
        self.per_second, self.most = rate / 60.0, max(1.0, rate / 4.0)
        self.buckets: dict[str, tuple[float, float]] = {}

    def wait_s(self, client: str, now: float) -> float:
        """Seconds until this client may ask again; 0 where it may ask now."""
        left, last = self.buckets.pop(client, (self.most, now))
        left = min(self.most, left + (now - last) * self.per_second)
        wait = 0.0 if left >= 1.0 else (1.0 - left) / self.per_second
        self.buckets[client] = (left if wait else left - 1.0, now)
        if len(self.buckets) > MOST_CLIENTS:
            del self.buckets[next(iter(self.buckets))]
        return wait


class Guard:
    """Refuses with a problem document, before anything is read or computed.

    Requests that wait for their client (for a body, or for room to send) do not count as computed, so that
    slow clients take no room from others. Limits hold per process.
    """

    def __init__(
        self,
        app: ASGIApp,
        settings: Settings,
        refuse: Callable[[Request, Problem], Response],
    ) -> None:
        self.app, self.refuse, self.settings = app, refuse, settings
        self.hosts = {h.strip().lower() for h in settings.allowed_hosts.split(",") if h.strip()}
        self.patience_s, self.room = float(settings.request_time), settings.running_limit
        self.rates = _Rates(settings.rate_limit) if settings.rate_limit else None
        self.running = 0

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Pass the request on, or refuse it."""
        if scope["type"] != "http" or scope["path"].startswith(OPERATION):
            await self.app(scope, receive, send)
            return
        request = Request(scope)
        try:
            self._admit(request)
        except Problem as problem:
            await self.refuse(request, problem)(scope, receive, send)
            return
        self.running += 1
        try:
            # Every request that has arrived counts before the first of them is computed.
            await asyncio.sleep(0)
            await self._serve(request, receive, send)
        finally:
            self.running -= 1

    def _admit(self, request: Request) -> None:
        host = request.headers.get("host", "").lower()
        name, colon, port = host.rpartition(":")
        if self.hosts and (name if colon and port.isdigit() else host) not in self.hosts:
            raise UnknownHost(f"the host {host[:100]!r} is not one that this service serves")
        if self.rates is not None:
            wait = self.rates.wait_s(peer_of(request, self.settings), time.monotonic())
            if wait:
                raise TooManyRequests(int(wait) + 1)
        if self.running >= self.room:
            raise Overloaded(self.room)

    async def _serve(self, request: Request, receive: Receive, send: Send) -> None:
        started, arrived = False, False
        deadline = time.monotonic() + self.patience_s

        async def patient_receive() -> Message:
            nonlocal arrived, deadline
            if arrived:
                return await receive()
            self.running -= 1
            try:
                message = await asyncio.wait_for(receive(), max(deadline - time.monotonic(), 0.001))
            except TimeoutError:
                raise BodyTooSlow(self.patience_s) from None
            finally:
                self.running += 1
            arrived = not message.get("more_body", False)
            deadline += len(message.get("body", b"")) / STEADY
            if arrived and message.get("body"):
                if self.running > self.room:
                    raise Overloaded(self.room)
                await asyncio.sleep(0)
            return message

        async def patient_send(message: Message) -> None:
            nonlocal started
            started = True
            self.running -= 1
            try:
                await send(message)
            finally:
                self.running += 1

        try:
            await self.app(request.scope, patient_receive, patient_send)
        except ClientDisconnect:
            return  # nobody is left to be answered
        except Problem as problem:
            if started:
                raise
            await self.refuse(request, problem)(request.scope, receive, send)
