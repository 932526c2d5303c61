"""The application: routes, error answers and headers put together."""

from __future__ import annotations

from collections.abc import Awaitable, Callable

from fastapi import FastAPI, Request
from starlette.exceptions import HTTPException
from starlette.responses import Response

from service import __version__
from service.contract.answer import rule_sets
from service.contract.classification import schemes
from service.contract.problem import NotFound, Problem
from service.files import DATA
from service.register.database import Database, database_url
from service.rules.airspace import airspace_tables
from service.rules.eyewear import eyewear_tables
from service.rules.gain_media import gain_media
from service.rules.materials import materials
from service.settings import Settings
from service.sign.tables import sign_tables
from service.web import (
    api,
    bounds_api,
    bounds_pages,
    bulk,
    differences_page,
    exports,
    guide,
    health,
    measured_pages,
    metrics,
    pages,
    partial_source_pages,
    profile_pages,
    report,
    rules_pages,
    sign,
    static,
    sweep,
    tolerance_pages,
    trust_api,
    trust_pages,
)
from service.web.guard import Guard
from service.web.headers import Envelope
from service.web.openapi import describe
from service.web.problems import PlainProblem, problem_response
from service.web.register import (
    api_admin,
    api_csv,
    api_lasers,
    api_shelf,
    pages_accounts,
    pages_csv,
    pages_lasers,
    pages_shelf,
    pages_signoff,
    paper,
)

__all__ = ["create_app"]

REGISTER = (
    *(api_csv, api_lasers, api_shelf, api_admin, paper),
    *(pages_csv, pages_lasers, pages_signoff, pages_shelf, pages_accounts),
)


def create_app(settings: Settings | None = None) -> FastAPI:
    """The application. Raises TableError where a rule table cannot be used."""
    rule_sets()
    schemes()
    eyewear_tables(DATA)
    sign_tables()
    airspace_tables(DATA)
    materials(DATA)
    gain_media(DATA)
    app = FastAPI(
        title="Blinkline",
        version=__version__,
        openapi_url="/api/v1/openapi.json",
        docs_url=None,
        redoc_url=None,
    )
    app.state.settings = settings or Settings()
    app.state.register = Database(database_url(app.state.settings.database, app.state.settings.data_dir))
    for module in (
        api,
        bounds_api,
        bounds_pages,
        bulk,
        differences_page,
        exports,
        guide,
        health,
        measured_pages,
        metrics,
        pages,
        partial_source_pages,
        profile_pages,
        report,
        rules_pages,
        sign,
        static,
        sweep,
        tolerance_pages,
        trust_api,
        trust_pages,
        *REGISTER,
    ):
        app.include_router(module.router)
    describe(app)

    async def on_problem(request: Request, error: Exception) -> Response:
        assert isinstance(error, Problem)
        return problem_response(request, error, error.headers)

    async def on_http(request: Request, error: Exception) -> Response:
        assert isinstance(error, HTTPException)
        if error.status_code == 404:
            return problem_response(request, NotFound(f"{request.url.path} is no address of this service"))
        problem = PlainProblem(error.status_code, str(error.detail))
        return problem_response(request, problem, dict(error.headers or {}))

    def on_failure(request: Request) -> Response:
        detail = "The service failed on this request. Nothing was computed; please report it."
        return problem_response(request, PlainProblem(500, detail))

    handlers: dict[int | type[Exception], Callable[[Request, Exception], Awaitable[Response]]] = {
        Problem: on_problem,
        HTTPException: on_http,
    }
    for kind, handler in handlers.items():
        app.add_exception_handler(kind, handler)
    app.add_middleware(Guard, settings=app.state.settings, refuse=problem_response)
    app.add_middleware(metrics.Measured)
    app.add_middleware(Envelope, on_failure=on_failure)
    return app
