"""The guide: how to read a result, inputs, what is not covered, API, tables and operation.

Lists of settings, addresses, fields and columns come from the code; `data/guide/` says what each means.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, fields
from functools import cache
from typing import Any

from fastapi import APIRouter, FastAPI
from starlette.requests import Request
from starlette.responses import Response

from service.contract.problem import NotFound
from service.contract.request import EvaluationRequest
from service.files import DATA
from service.rules.tables import read_toml
from service.settings import Settings
from service.web.templates import page

__all__ = [
    "Field",
    "Setting",
    "examples",
    "guide_table",
    "input_fields",
    "paths_of",
    "router",
    "settings_table",
]

router = APIRouter(include_in_schema=False)

TOPICS = {
    "": "How to read a result",
    "inputs": "What each input means",
    "coverage": "What is not covered",
    "api": "API, with examples",
    "tables": "Columns of the tables",
    "operation": "For operators",
}


@dataclass(frozen=True, slots=True)
class Setting:
    """One setting: its variable, default and meaning."""

    variable: str
    default: str
    meaning: str


@dataclass(frozen=True, slots=True)
class Field:
    """One field of the request: where it stands, what it may hold and what it means."""

    part: str
    name: str
    allowed: str
    default: str
    meaning: str


@cache
def guide_table(name: str) -> dict[str, Any]:
    """A file of the guide."""
    return read_toml(DATA / "guide" / f"{name}.toml")


def examples() -> list[dict[str, str]]:
    """The examples of the API: title, text, code, what it prints (`says`) and where that is known from."""
    return list(guide_table("examples")["example"])


def settings_table() -> list[Setting]:
    """Every setting of the code. A setting that the guide does not know has an empty meaning."""
    meanings, defaults = guide_table("settings"), Settings()
    return [
        Setting(
            f"BLINKLINE_{f.name.upper()}",
            str(getattr(defaults, f.name)) or "blank",
            meanings.get(f.name, ""),
        )
        for f in fields(Settings)
    ]


def paths_of(app: FastAPI) -> list[str]:
    """Every address of the application, those of routers included; {names} without what they may hold."""

    def walk(routes: Iterable[Any]) -> Iterator[str]:
        for route in routes:
            inner = getattr(route, "original_router", None)
            if inner is not None:
                yield from walk(inner.routes)
            elif hasattr(route, "path"):
                yield re.sub(r":\w+}", "}", route.path)

    return sorted(set(walk(app.routes)))


def input_fields() -> list[Field]:
    """Every field of a request, in the order of the contract; `part` is blank for the request itself."""
    schema, words = EvaluationRequest.model_json_schema(), guide_table("inputs")
    parts = {
        "request": schema,
        **{part: schema["$defs"].get(part, {}) for part in words if part != "request"},
    }
    parts |= {part: node for part, node in schema["$defs"].items() if "properties" in node}
    return [
        Field(part, name, _allowed(node), _default(node), words.get(part, {}).get(name, ""))
        for part, model in parts.items()
        for name, node in model.get("properties", {}).items()
    ]


def _allowed(node: dict[str, Any]) -> str:
    """What a field may hold, short: 180 to 1e+06; gaussian, tophat."""
    kinds = [k for k in node.get("anyOf", [node]) if k.get("type") != "null"]
    node = next((k for k in kinds if k.get("type") in ("number", "integer")), kinds[0])
    if "enum" in node or "const" in node:
        return ", ".join(map(str, node.get("enum", [node.get("const")])))
    low, more = (
        node.get("minimum", node.get("exclusiveMinimum")),
        "above " if "exclusiveMinimum" in node else "",
    )
    if low is not None and "maximum" in node:
        return f"{more}{low:g} to {node['maximum']:g}"
    if node.get("type") == "array":
        return f"{node.get('minItems', 0)} to {node['maxItems']} items"
    if node.get("type") == "string" and "maxLength" in node:
        return f"up to {node['maxLength']} characters"
    return "true or false" if node.get("type") == "boolean" else "see below"


def _default(node: dict[str, Any]) -> str:
    value = node.get("default", "")
    return "" if value is None or value == {} else "none" if value == [] else str(value)


@router.get("/guide")
async def guide(request: Request) -> Response:
    """How to read a result."""
    return page(request, "guide/result.html", topics=TOPICS)


@router.get("/guide/{topic}")
async def guide_page(request: Request, topic: str) -> Response:
    """Another page of the guide."""
    if topic not in TOPICS:
        raise NotFound(f"the guide has no page {topic[:100]!r}; it has {', '.join(filter(None, TOPICS))}")
    more: dict[str, Any] = {}
    if topic == "inputs":
        more = {"fields": input_fields()}
    elif topic == "api":
        known = guide_table("routes")
        more = {"examples": examples(), "paths": [(p, known.get(p, "")) for p in paths_of(request.app)]}
    elif topic == "tables":
        more = {"columns": guide_table("columns")}
    elif topic == "operation":
        more = {"settings": settings_table()}
    return page(request, f"guide/{topic}.html", topics=TOPICS, **more)
