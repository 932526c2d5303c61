"""Counts and durations of requests for a monitoring system, by the template of the route."""

from __future__ import annotations

import os
import time

from fastapi import APIRouter
from prometheus_client import (
    CONTENT_TYPE_LATEST,
    CollectorRegistry,
    Counter,
    Gauge,
    Histogram,
    generate_latest,
)
from prometheus_client.multiprocess import MultiProcessCollector
from starlette.responses import Response
from starlette.types import ASGIApp, Message, Receive, Scope, Send

__all__ = ["Measured", "router"]

router = APIRouter(tags=["operation"])

#: What several workers share their counts by; set by `blinkline serve --workers`.
SHARED = "PROMETHEUS_MULTIPROC_DIR"
BUCKETS = (0.001, 0.002, 0.005, 0.01, 0.025, 0.05, 0.1, 0.25, 0.5, 1.0, 2.5, 5.0, 10.0, 60.0)
REQUESTS = Counter(
    "blinkline_requests", "Requests answered, by route, method and status.", ("route", "method", "status")
)
SECONDS = Histogram(
    "blinkline_request_seconds",
    "Time from the request to the end of its answer.",
    ("route",),
    buckets=BUCKETS,
)
RUNNING = Gauge("blinkline_requests_running", "Requests being answered.", multiprocess_mode="livesum")
#: Route of a request that no route takes: an address of the caller's choice must not make a new label.
UNKNOWN = "unknown"
METHODS = {"GET", "HEAD", "POST", "PUT", "PATCH", "DELETE", "OPTIONS"}


@router.get("/metrics", include_in_schema=False)
async def metrics() -> Response:
    """The numbers of this process, of all workers where they share them."""
    if SHARED in os.environ:
        registry = CollectorRegistry()
        MultiProcessCollector(registry)  # type: ignore[no-untyped-call]
        return Response(generate_latest(registry), media_type=CONTENT_TYPE_LATEST)
    return Response(generate_latest(), media_type=CONTENT_TYPE_LATEST)


class Measured:
    """Counts what passes, to the end of the body."""

    def __init__(self, app: ASGIApp) -> None:
        self.app = app

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Pass the request on."""
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return
        status, start = 500, time.perf_counter()

        async def noted(message: Message) -> None:
            nonlocal status
            if message["type"] == "http.response.start":
                status = message["status"]
            await send(message)

        RUNNING.inc()
        try:
            await self.app(scope, receive, noted)
        finally:
            RUNNING.dec()
            route = getattr(scope.get("route"), "path", UNKNOWN)
            method = scope["method"] if scope["method"] in METHODS else UNKNOWN
            REQUESTS.labels(route, method, str(status)).inc()
            SECONDS.labels(route).observe(time.perf_counter() - start)
