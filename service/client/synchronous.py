"""The synchronous client."""

from __future__ import annotations

import time
from collections.abc import Iterator

import httpx

from service.client import calls
from service.client.calls import Body, Call, Done, InConflict, Shared, Stale, T, Unreachable
from service.contract.evaluation import EvaluationResult
from service.register.importing import Imported
from service.register.matching import PairMatch
from service.register.models import EyewearRecord, Laser, LaserSummary, Revision

__all__ = ["Client"]


class Client(Shared):
    """Synchronous. Use as a context manager, or call `close`."""

    def __init__(
        self,
        base_url: str = "http://127.0.0.1:8321",
        token: str | None = None,
        *,
        retries: int = 4,
        timeout_s: float = 30.0,
        transport: httpx.BaseTransport | None = None,
    ) -> None:
        super().__init__(base_url, token, retries, timeout_s)
        self._http = httpx.Client(transport=transport, **self.options)

    def __enter__(self) -> Client:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        """Close the connections."""
        self._http.close()

    def _run(self, call: Call[T]) -> T:
        tries = 0
        while True:
            response = None
            try:
                response = self._http.request(
                    call.method, call.path, params=call.params, content=call.content, headers=call.headers
                )
                if not self.after(call, response, tries):
                    return call.read(response)
            except httpx.TransportError as error:
                self.lost(call, error, tries)
            time.sleep(calls.pause(tries, response))
            tries += 1

    def evaluate(self, request: Body) -> EvaluationResult:
        """Evaluate one request without storing it."""
        return self._run(calls.evaluate(request))

    def lasers(self, **filters: str | bool) -> Iterator[LaserSummary]:
        """Every laser that the filters of GET /api/v1/lasers name, page after page."""
        cursor: str | None = None
        while True:
            page = self._run(calls.lasers_page(cursor, filters))
            yield from page.items
            if (cursor := page.next) is None:
                return

    def find(self, asset_tag: str) -> LaserSummary | None:
        """The laser with this asset tag."""
        page = self._run(calls.lasers_page(None, {"asset_tag": asset_tag}))
        return page.items[0] if page.items else None

    def laser(self, laser_id: int) -> Laser:
        """One laser."""
        return self._run(calls.laser_of(laser_id))

    def create(self, body: Body) -> Laser:
        """Store a laser as a draft."""
        return self._run(calls.create(body))

    def change(self, laser: LaserSummary, body: Body) -> Laser:
        """Replace a laser as it was read. Raises Stale where somebody else changed it."""
        return self._run(calls.change(laser, body))

    def upsert(self, body: Body) -> tuple[Laser, Done]:
        """Create the laser, or change the one with this asset tag; a lost race is run again.

        Of a laser that is there, what the body does not name stays as it is.
        """
        tag = calls.tag_of(body)
        for _ in range(5):
            found = self.find(tag)
            try:
                if found is None:
                    return self.create(body), "created"
                laser = self.change(found, calls.merged(found, body))
            except Stale:
                continue
            except InConflict:
                if found is not None:
                    raise
                continue
            return laser, "changed" if laser.version != found.version else "unchanged"
        raise Unreachable(f"{tag}: others change it faster than it can be read")

    def submit(self, laser: LaserSummary, comment: str = "") -> Laser:
        """Submit the current revision."""
        return self._run(calls.step(laser, "submit", comment, None))

    def approve(self, laser: LaserSummary, comment: str = "", review_due: str | None = None) -> Laser:
        """Approve the current revision."""
        return self._run(calls.step(laser, "approve", comment, review_due))

    def return_(self, laser: LaserSummary, comment: str) -> Laser:
        """Return the current revision."""
        return self._run(calls.step(laser, "return", comment, None))

    def revisions(self, laser_id: int) -> list[Revision]:
        """The history of a laser."""
        return self._run(calls.revisions_of(laser_id))

    def eyewear_for(self, laser_id: int) -> list[PairMatch]:
        """Pairs on the shelf, those that will do first."""
        return self._run(calls.eyewear_for(laser_id))

    def add_eyewear(self, body: Body) -> EyewearRecord:
        """Put a pair on the shelf."""
        return self._run(calls.put_on_shelf(body))

    def import_csv(self, data: bytes, check_only: bool = False) -> Imported:
        """Import a CSV file, all or none."""
        return self._run(calls.import_csv(data, check_only))
