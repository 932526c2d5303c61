"""Problems as answers: a problem document for programs, a page for people."""

from __future__ import annotations

from starlette.requests import Request
from starlette.responses import Response

from service.contract.problem import Problem
from service.web.templates import page

__all__ = ["PlainProblem", "problem_response", "wants_page"]

MEDIA = "application/problem+json"


class PlainProblem(Problem):
    """A problem known by its HTTP status alone."""

    slug = "http"
    title = "The request cannot be answered"

    def __init__(self, status: int, detail: str) -> None:
        super().__init__(detail)
        self.status = status


def wants_page(request: Request) -> bool:
    """Whether a person asks: outside the API, with a client that takes HTML."""
    return not request.url.path.startswith("/api/") and "text/html" in request.headers.get("accept", "")


def problem_response(request: Request, problem: Problem, headers: dict[str, str] | None = None) -> Response:
    """The answer to a failed request."""
    document = problem.document()
    headers = {**problem.headers, **(headers or {})}
    if wants_page(request):
        return page(request, "problem.html", status=problem.status, headers=headers, problem=document)
    body = document.model_dump_json()
    return Response(body, problem.status, headers=headers, media_type=MEDIA)
