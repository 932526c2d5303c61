"""Calls of the application in this process, and the lasers that the checks start from."""

from __future__ import annotations

import asyncio
import copy
import re
from typing import Any

import httpx

from service.app import create_app
from service.settings import Settings
from tests.web.client import GOOD, strict_json

__all__ = ["HTML", "LASERS", "PAIR", "Web", "laser"]

LASERS = "/api/v1/lasers"
HTML = {"accept": "text/html,application/xhtml+xml"}
#: A pair for the laser of the contract's example (532 nm).
PAIR: dict[str, Any] = {
    "tag": "EW-1",
    "pair": {
        "name": "Green",
        "ranges": [{"from_nm": 515, "to_nm": 540, "optical_density": 6, "marking": "D LB6 + IR LB6"}],
    },
    "quantity": 3,
    "place": "Cabinet 2",
}


def laser(tag: str = "BL-001", **more: Any) -> dict[str, Any]:
    """A laser to be stored; `power_w` sets its power."""
    request = copy.deepcopy(GOOD)
    if "power_w" in more:
        request["lines"][0]["emission"]["power_w"] = more.pop("power_w")
    request["label"] = more.get("label", request["label"])
    return {"asset_tag": tag, "label": request["label"], "request": request, **more}


class Web:
    """One application, one visitor with cookies; one event loop for all calls."""

    def __init__(
        self, address: str, base: str = "http://127.0.0.1:8321", peer: str = "127.0.0.1", **settings: Any
    ) -> None:
        self.app = create_app(Settings(database=address, **settings))
        self._runner = asyncio.Runner()
        self.base = base
        self.client = self.visitor(peer)

    def visitor(self, peer: str = "127.0.0.1") -> httpx.AsyncClient:
        """Somebody else, without cookies."""
        transport = httpx.ASGITransport(self.app, raise_app_exceptions=False, client=(peer, 1234))
        return httpx.AsyncClient(transport=transport, base_url=self.base)

    def request(
        self, method: str, url: str, by: httpx.AsyncClient | None = None, **more: Any
    ) -> httpx.Response:
        return self._runner.run((by or self.client).request(method, url, **more))

    def together(self, calls: list[tuple[str, str, dict[str, Any]]]) -> list[httpx.Response]:
        """Several calls at once."""

        async def run() -> list[httpx.Response]:
            return await asyncio.gather(*(self.client.request(m, u, **more) for m, u, more in calls))

        return self._runner.run(run())

    def run(self, coroutine: Any) -> Any:
        return self._runner.run(coroutine)

    def get(self, url: str, **more: Any) -> httpx.Response:
        return self.request("GET", url, **more)

    def post(self, url: str, json: Any = None, **more: Any) -> httpx.Response:
        return self.request("POST", url, **({"json": json} if json is not None else {}), **more)

    def ok(self, response: httpx.Response, status: int = 200) -> Any:
        """The JSON of an answer that must succeed."""
        assert response.status_code == status, (response.status_code, response.text[:600])
        return strict_json(response.text)

    def create(self, body: dict[str, Any]) -> dict[str, Any]:
        found: dict[str, Any] = self.ok(self.post(LASERS, body), 201)
        return found

    def put(self, found: dict[str, Any], body: dict[str, Any]) -> httpx.Response:
        """Change a laser as it was read."""
        headers = {"if-match": f'"laser-{found["id"]}-{found["version"]}"'}
        return self.request("PUT", f"{LASERS}/{found['id']}", json=body, headers=headers)

    def step(self, found: dict[str, Any], step: str, **body: Any) -> httpx.Response:
        return self.post(f"{LASERS}/{found['id']}/revisions/{found['revision']}/{step}", body)

    def form(self, url: str, fields: dict[str, Any], page: str = "", **more: Any) -> httpx.Response:
        """Send a form as its page would: with the token of that page."""
        shown = self.get(page or url, headers=HTML)
        match = re.search(r'name="csrf" value="([0-9a-f]{64})"', shown.text)
        assert match, shown.text[:500]
        return self.post(url, data={"csrf": match[1], **fields}, headers=HTML, **more)

    def close(self) -> None:
        self._runner.run(self.client.aclose())
        self._runner.close()
        self.app.state.register.close()
