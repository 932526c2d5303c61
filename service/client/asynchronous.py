"""The asynchronous client."""

from __future__ import annotations

import asyncio
from collections.abc import AsyncIterator

import httpx

from service.client import calls
from service.client.calls import Body, Call, Done, InConflict, Shared, Stale, T, Unreachable
from service.contract.evaluation import EvaluationResult
from service.register.importing import Imported
from service.register.matching import PairMatch
from service.register.models import EyewearRecord, Laser, LaserSummary, Revision

__all__ = ["AsyncClient"]


class AsyncClient(Shared):
    """Asynchronous. Use as an asynchronous context manager, or call `close`."""

    def __init__(
        self,
        base_url: str = "http://127.0.0.1:8321",
        token: str | None = None,
        *,
        retries: int = 4,
        timeout_s: float = 30.0,
        transport: httpx.AsyncBaseTransport | None = None,
    ) -> None:
        super().__init__(base_url, token, retries, timeout_s)
        self._http = httpx.AsyncClient(transport=transport, **self.options)

    async def __aenter__(self) -> AsyncClient:
        return self

    async def __aexit__(self, *_: object) -> None:
        await self.close()

    async def close(self) -> None:
        """Close the connections."""
        await self._http.aclose()

    async def _run(self, call: Call[T]) -> T:
        tries = 0
        while True:
            response = None
            try:
                response = await self._http.request(
                    call.method, call.path, params=call.params, content=call.content, headers=call.headers
                )
                if not self.after(call, response, tries):
                    return call.read(response)
            except httpx.TransportError as error:
                self.lost(call, error, tries)
            await asyncio.sleep(calls.pause(tries, response))
            tries += 1

    async def evaluate(self, request: Body) -> EvaluationResult:
        """Evaluate one request without storing it."""
        return await self._run(calls.evaluate(request))

    async def lasers(self, **filters: str | bool) -> AsyncIterator[LaserSummary]:
        """Every laser that the filters of GET /api/v1/lasers name, page after page."""
        cursor: str | None = None
        while True:
            page = await self._run(calls.lasers_page(cursor, filters))
            for item in page.items:
                yield item
            if (cursor := page.next) is None:
                return

    async def find(self, asset_tag: str) -> LaserSummary | None:
        """The laser with this asset tag."""
        page = await self._run(calls.lasers_page(None, {"asset_tag": asset_tag}))
        return page.items[0] if page.items else None

    async def laser(self, laser_id: int) -> Laser:
        """One laser."""
        return await self._run(calls.laser_of(laser_id))

    async def create(self, body: Body) -> Laser:
        """Store a laser as a draft."""
        return await self._run(calls.create(body))

    async def change(self, laser: LaserSummary, body: Body) -> Laser:
        """Replace a laser as it was read. Raises Stale where somebody else changed it."""
        return await self._run(calls.change(laser, body))

    async def upsert(self, body: Body) -> tuple[Laser, Done]:
        """Create the laser, or change the one with this asset tag; a lost race is run again.

        Of a laser that is there, what the body does not name stays as it is.
        """
        tag = calls.tag_of(body)
        for _ in range(5):
            found = await self.find(tag)
            try:
                if found is None:
                    return await self.create(body), "created"
                laser = await self.change(found, calls.merged(found, body))
            except Stale:
                continue
            except InConflict:
                if found is not None:
                    raise
                continue
            return laser, "changed" if laser.version != found.version else "unchanged"
        raise Unreachable(f"{tag}: others change it faster than it can be read")

    async def submit(self, laser: LaserSummary, comment: str = "") -> Laser:
        """Submit the current revision."""
        return await self._run(calls.step(laser, "submit", comment, None))

    async def approve(self, laser: LaserSummary, comment: str = "", review_due: str | None = None) -> Laser:
        """Approve the current revision."""
        return await self._run(calls.step(laser, "approve", comment, review_due))

    async def return_(self, laser: LaserSummary, comment: str) -> Laser:
        """Return the current revision."""
        return await self._run(calls.step(laser, "return", comment, None))

    async def revisions(self, laser_id: int) -> list[Revision]:
        """The history of a laser."""
        return await self._run(calls.revisions_of(laser_id))

    async def eyewear_for(self, laser_id: int) -> list[PairMatch]:
        """Pairs on the shelf, those that will do first."""
        return await self._run(calls.eyewear_for(laser_id))

    async def add_eyewear(self, body: Body) -> EyewearRecord:
        """Put a pair on the shelf."""
        return await self._run(calls.put_on_shelf(body))

    async def import_csv(self, data: bytes, check_only: bool = False) -> Imported:
        """Import a CSV file, all or none."""
        return await self._run(calls.import_csv(data, check_only))
