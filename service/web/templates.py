"""Templates: one environment, strict, everything escaped."""

from __future__ import annotations

from functools import cache
from typing import Any

from jinja2 import Environment, FileSystemLoader, StrictUndefined
from starlette.requests import Request
from starlette.responses import HTMLResponse

from service import __version__
from service.files import TEMPLATES
from service.web import formula, numbers, present
from service.web.chart import chart_of
from service.web.packed import packed
from service.web.static import static_address

__all__ = ["environment", "page"]


@cache
def environment() -> Environment:
    """The template environment."""
    env = Environment(
        loader=FileSystemLoader(TEMPLATES),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    env.filters.update(
        down=numbers.shown_down,
        exactly=present.exactly,
        formula=formula.formula,
        plain=numbers.plain,
        ten=formula.power_of_ten,
        typeset=numbers.typeset,
        up=numbers.shown_up,
    )
    env.globals.update(chart_of=chart_of, static=static_address, version=__version__, present=present)
    return env


def page(
    request: Request, name: str, *, status: int = 200, headers: dict[str, str] | None = None, **values: Any
) -> HTMLResponse:
    """A page from a template."""
    text = environment().get_template(name).render(path=request.url.path, **values)
    content, how = packed(request, text.encode())
    return HTMLResponse(content, status, headers={"cache-control": "no-store", **how, **(headers or {})})
