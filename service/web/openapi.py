"""The OpenAPI document: request bodies, problems and examples added to what the routes declare."""

from __future__ import annotations

from typing import Any

from fastapi import FastAPI
from fastapi.openapi.utils import get_openapi
from pydantic import BaseModel
from pydantic.json_schema import models_json_schema

from service.contract.problem import ProblemDocument
from service.contract.request import EvaluationRequest
from service.web.bounds_api import BODIES as LATER

__all__ = ["describe"]

TEMPLATE = "#/components/schemas/{model}"
BODIES: dict[str, type[BaseModel]] = {
    "/api/v1/evaluate": EvaluationRequest,
    "/api/v1/compare": EvaluationRequest,
    **LATER,
}
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


def describe(app: FastAPI) -> None:
    """Replace the application's OpenAPI builder by one that also knows bodies and problems."""

    def openapi() -> dict[str, Any]:
        if app.openapi_schema:
            return app.openapi_schema
        document = get_openapi(title=app.title, version=app.version, routes=app.routes)
        _, definitions = models_json_schema(
            [
                *((m, "validation") for m in dict.fromkeys(BODIES.values())),
                (ProblemDocument, "serialization"),
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
        for path, operations in document["paths"].items():
            for operation in operations.values():
                operation["responses"].pop("422", None)
                statuses = ("400", "413", "415", "422") if path in BODIES else ("404",) if "{" in path else ()
                for status in statuses:
                    operation["responses"][status] = problem
                if path in BODIES:
                    model = BODIES[path]
                    content: dict[str, Any] = {"schema": {"$ref": TEMPLATE.format(model=model.__name__)}}
                    if model is EvaluationRequest:
                        content["examples"] = EXAMPLES
                    operation["requestBody"] = {"required": True, "content": {"application/json": content}}
        app.openapi_schema = document
        return document

    app.openapi = openapi  # type: ignore[method-assign]
