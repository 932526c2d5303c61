"""One small synchronous client over the application, and the requests that the checks start from."""

from __future__ import annotations

import asyncio
import copy
import json
from collections.abc import Iterator
from typing import Any

import httpx
import pytest

from service.app import create_app

__all__ = [
    "COMPARE",
    "EVALUATE",
    "GOOD",
    "JSON",
    "RULES",
    "SCHEMES",
    "Client",
    "changed",
    "client",
    "laser",
    "strict_json",
]

EVALUATE, COMPARE = "/api/v1/evaluate", "/api/v1/compare"
JSON = {"content-type": "application/json"}
#: The rule sets of the service, the default of contract v1 first.
RULES = ("icnirp-2013", "ansi-z136-1-2014", "eu-2006-25", "iec-60825-1-2014")
#: Its classification schemes, the default first.
SCHEMES = ("iec-60825-1-2014", "us-21cfr1040")

#: The example of contract v1.
GOOD: dict[str, Any] = {
    "label": "Bench 4 alignment beam",
    "rules": "icnirp-2013",
    "exposure_s": 0.25,
    "lines": [
        {
            "wavelength_nm": 532,
            "emission": {"mode": "cw", "power_w": 0.1},
            "beam": {"profile": "gaussian", "diameter_mm": 2.0, "divergence_mrad": 1.0, "level": "1/e2"},
            "subtense_mrad": 1.5,
        }
    ],
    "bench": [],
    "viewing": {},
}


class Client:
    """Calls the application in this process; one event loop for all calls."""

    def __init__(self) -> None:
        self._runner = asyncio.Runner()
        transport = httpx.ASGITransport(create_app(), raise_app_exceptions=False)
        self._client = httpx.AsyncClient(transport=transport, base_url="http://blinkline.test")

    def request(self, method: str, url: str, **more: Any) -> httpx.Response:
        return self._runner.run(self._client.request(method, url, **more))

    def send(self, request: httpx.Request) -> httpx.Response:
        return self._runner.run(self._client.send(request))

    def get(self, url: str, **more: Any) -> httpx.Response:
        return self.request("GET", url, **more)

    def post(self, url: str, **more: Any) -> httpx.Response:
        return self.request("POST", url, **more)

    def evaluate(self, body: Any) -> dict[str, Any]:
        """The answer to a request that must succeed."""
        answer = self.post(EVALUATE, json=body)
        assert answer.status_code == 200, answer.text
        return strict_json(answer.text)

    def close(self) -> None:
        self._runner.run(self._client.aclose())
        self._runner.close()


@pytest.fixture(scope="session")
def client() -> Iterator[Client]:
    opened = Client()
    yield opened
    opened.close()


def _refuse(name: str) -> None:
    raise AssertionError(f"{name} is no JSON")


def strict_json(text: str) -> Any:
    """JSON without NaN and Infinity."""
    return json.loads(text, parse_constant=_refuse)


def changed(path: str, value: Any, start: dict[str, Any] = GOOD) -> dict[str, Any]:
    """A request with one field set; a path such as lines.0.beam.level."""
    body = copy.deepcopy(start)
    *way, last = path.split(".")
    place: Any = body
    for step in way:
        place = place[int(step)] if isinstance(place, list) else place[step]
    place[int(last) if isinstance(place, list) else last] = value
    return body


def laser(wavelength_nm: float, emission: dict[str, Any], **more: Any) -> dict[str, Any]:
    """A request with one line; beam fields and top fields by name."""
    beam: dict[str, Any] = {"diameter_mm": 2.0, "divergence_mrad": 1.0}
    line: dict[str, Any] = {"wavelength_nm": wavelength_nm, "emission": emission, "beam": beam}
    body: dict[str, Any] = {"lines": [line]}
    for name, value in more.items():
        if name in ("profile", "diameter_mm", "divergence_mrad", "level", "waist_m"):
            beam[name] = value
        elif name == "subtense_mrad":
            line[name] = value
        else:
            body[name] = value
    return body
