"""The OpenAPI document: request bodies, problems and examples added to what the routes declare."""

from __future__ import annotations

from typing import Any

from fastapi import FastAPI
from fastapi.openapi.utils import get_openapi
from pydantic import BaseModel
from pydantic.json_schema import models_json_schema

from service.bulk.records import DETAILS
from service.bulk.summary import Closing, ProblemRecord, Summary
from service.contract.problem import ProblemDocument
from service.contract.report import ReportRequest
from service.contract.request import EvaluationRequest
from service.contract.sweep import SweepRequest
from service.sign.request import SignRequest
from service.web.bounds_api import BODIES as BOUNDS
from service.web.bulk import NDJSON
from service.web.register.described import BODIES as REGISTER_BODIES

__all__ = ["describe"]

TEMPLATE = "#/components/schemas/{model}"
CLOSING = TEMPLATE.format(model="Closing")
BULK = "/api/v1/evaluate/bulk"
BODIES: dict[str, type[BaseModel]] = {
    "/api/v1/evaluate": EvaluationRequest,
    "/api/v1/compare": EvaluationRequest,
    "/api/v1/sign": SignRequest,
    **BOUNDS,
}
#: Bodies that hold an evaluation request beside fields of their own, each with what those may be.
ENCLOSING: dict[str, tuple[type[BaseModel], dict[str, Any]]] = {
    "/api/v1/report": (ReportRequest, {"paper": "a4", "date": "2026-12-01", "place": "Laboratory 2"}),
    "/api/v1/sweep": (
        SweepRequest,
        {"sweep": {"field": "power_w", "start": 1e-4, "stop": 10.0, "points": 101, "spacing": "log"}},
    ),
}
#: What stands on the lines of a bulk answer: with detail=full, whole results with an index.
RECORDS: tuple[type[BaseModel], ...] = (Summary, ProblemRecord, Closing)
EXAMPLES: dict[str, dict[str, Any]] = {
    "continuous": {
        "summary": "A green alignment beam, continuous wave",
        "value": {
            "label": "Bench 4 alignment beam",
            "exposure_s": 0.25,
            "lines": [
                {
                    "wavelength_nm": 532,
                    "emission": {"mode": "cw", "power_w": 0.1},
                    "beam": {"diameter_mm": 2.0, "divergence_mrad": 1.0},
                }
            ],
        },
    },
    "pulse": {
        "summary": "One infrared pulse",
        "value": {
            "lines": [
                {
                    "wavelength_nm": 1064,
                    "emission": {"mode": "pulse", "energy_j": 0.05, "pulse_s": 1e-8},
                    "beam": {"diameter_mm": 6.0, "divergence_mrad": 0.5},
                }
            ]
        },
    },
    "train": {
        "summary": "A pulse train by its average power, elliptical beam",
        "value": {
            "rules": "eu-2006-25",
            "lines": [
                {
                    "wavelength_nm": 905,
                    "emission": {"mode": "train", "average_power_w": 0.02, "pulse_s": 1e-7, "rate_hz": 5000},
                    "beam": {"diameter_mm": [1.0, 4.0], "divergence_mrad": [12.0, 3.0], "level": "1/e"},
                }
            ],
            "viewing": {"distance_m": 2.0},
        },
    },
}

SIGN_EXAMPLES: dict[str, dict[str, Any]] = {
    "door": {
        "summary": "A sign for the door, A4, in two languages",
        "value": {
            "evaluation": EXAMPLES["continuous"]["value"],
            "sign": {"family": "iso", "sheet": "A4", "languages": ["en", "de"], "room": "Room 2.14"},
        },
    },
    "labels": {
        "summary": "Eight labels for the housing on one sheet",
        "value": {
            "evaluation": EXAMPLES["continuous"]["value"],
            "sign": {"kind": "label", "label_mm": [74, 37], "copies": 8},
        },
    },
}

EXAMPLES_OF = {EvaluationRequest: EXAMPLES, SignRequest: SIGN_EXAMPLES}


def _describe_bulk(operation: dict[str, Any], problem: dict[str, Any]) -> None:
    """Parameter, body and answer of the bulk call."""
    request = {"$ref": TEMPLATE.format(model="EvaluationRequest")}
    names = [model.__name__ for model in RECORDS[:2]] + ["EvaluationResult"]
    records: list[dict[str, Any]] = [{"$ref": TEMPLATE.format(model=name)} for name in names]
    closing = {"type": "object", "required": ["closing"], "properties": {"closing": {"$ref": CLOSING}}}
    operation["parameters"] = [
        {"name": "detail", "in": "query", "schema": {"enum": list(DETAILS), "default": DETAILS[0]}}
    ]
    operation["requestBody"] = {
        "required": True,
        "content": {
            NDJSON: {"schema": request},
            "application/json": {"schema": {"type": "array", "items": request}},
        },
    }
    operation["responses"] = {
        "200": {
            "description": "One record per line; the closing record is the last.",
            "content": {NDJSON: {"schema": {"anyOf": [*records, closing]}}},
        },
        **dict.fromkeys(("400", "413", "415", "422"), problem),
    }


def describe(app: FastAPI) -> None:
    """Replace the application's OpenAPI builder by one that also knows bodies and problems."""

    def openapi() -> dict[str, Any]:
        if app.openapi_schema:
            return app.openapi_schema
        document = get_openapi(title=app.title, version=app.version, routes=app.routes)
        answered: list[type[BaseModel]] = [ProblemDocument, *RECORDS]
        _, definitions = models_json_schema(
            [
                *((m, "validation") for m in dict.fromkeys((*BODIES.values(), *REGISTER_BODIES.values()))),
                *((model, "validation") for model, _ in ENCLOSING.values()),
                *((model, "serialization") for model in answered),
            ],
            ref_template=TEMPLATE,
        )
        document.setdefault("components", {}).setdefault("schemas", {}).update(definitions["$defs"])
        problem = {
            "description": "A problem document (RFC 9457)",
            "content": {
                "application/problem+json": {"schema": {"$ref": TEMPLATE.format(model="ProblemDocument")}}
            },
        }
        _describe_register(document, problem)
        for path, operations in document["paths"].items():
            for operation in operations.values():
                if operation.get("tags") == ["register"]:
                    continue
                operation["responses"].pop("422", None)
                bodied = path in BODIES or path in ENCLOSING
                statuses = ("400", "413", "415", "422") if bodied else ("404",) if "{" in path else ()
                for status in statuses:
                    operation["responses"][status] = problem
                if path in BODIES:
                    body = BODIES[path]
                    content: dict[str, Any] = {"schema": {"$ref": TEMPLATE.format(model=body.__name__)}}
                    if body in EXAMPLES_OF:
                        content["examples"] = EXAMPLES_OF[body]
                    operation["requestBody"] = {"required": True, "content": {"application/json": content}}
                if path in ENCLOSING:
                    model, own = ENCLOSING[path]
                    example = {"evaluation": EXAMPLES["continuous"]["value"], **own}
                    schema = {"$ref": TEMPLATE.format(model=model.__name__)}
                    operation["requestBody"] = {
                        "required": True,
                        "content": {"application/json": {"schema": schema, "example": example}},
                    }
        _describe_bulk(document["paths"][BULK]["post"], problem)
        app.openapi_schema = document
        return document

    app.openapi = openapi  # type: ignore[method-assign]


def _describe_register(document: dict[str, Any], problem: dict[str, Any]) -> None:
    """Bodies and problems of the register's routes."""
    for path, operations in document["paths"].items():
        for method, operation in operations.items():
            if operation.get("tags") != ["register"]:
                continue
            operation["responses"].pop("422", None)
            statuses = ["401", "403", "422", "503", *(["404", "409"] if "{" in path else [])]
            if path.endswith(("/sign", "/report")):
                statuses += ["400", "406"] if path.endswith("/sign") else ["400"]
            if method != "get":
                statuses += ["400", "409", "412", "413", "415", "428"]
                operation.setdefault(
                    "requestBody",
                    {"required": True, "content": {"application/json": {"schema": _body(method, path)}}},
                )
                if method == "delete":
                    del operation["requestBody"]
            for status in statuses:
                operation["responses"][status] = problem


def _body(method: str, path: str) -> dict[str, Any]:
    model = REGISTER_BODIES.get((method, path))
    if model is None:
        return {"type": "object", "maxProperties": 0}
    return {"$ref": TEMPLATE.format(model=model.__name__)}
