"""The typed client against a service on the wire, against a service that fails, and the README example."""

from __future__ import annotations

import asyncio
import io
import re
from contextlib import redirect_stdout
from pathlib import Path
from typing import Any

import httpx
import pytest

from service.client import (
    AsyncClient,
    Busy,
    Client,
    InConflict,
    Invalid,
    Missing,
    NotAllowed,
    Stale,
    Unreachable,
    calls,
)
from tests.register.web import PAIR, laser
from tests.web.client import GOOD
from tests.web.test_cli import serving

ROOT = Path(__file__).resolve().parents[2]


@pytest.fixture(scope="module")
def url(tmp_path_factory: pytest.TempPathFactory) -> Any:
    folder = tmp_path_factory.mktemp("served")
    with serving(folder, "--port", "0", BLINKLINE_DATA_DIR=str(folder / "data")) as address:
        yield address


def test_the_client_on_the_wire(url: str) -> None:
    with Client(url) as blinkline:
        answer = blinkline.evaluate(GOOD)
        made, done = blinkline.upsert({**laser("C-1"), "review_due": "2027-01-31"})
        assert (done, made.eye_hazard_distance_m) == ("created", answer.eye.hazard_distance_m)
        assert blinkline.upsert(laser("C-1"))[1] == "unchanged"
        changed, done = blinkline.upsert(laser("C-1", power_w=0.2))
        assert (done, changed.revision, changed.review_due) == ("changed", 2, "2027-01-31")
        with pytest.raises(Stale):
            blinkline.change(made, laser("C-1", power_w=0.3))
        submitted = blinkline.submit(changed, "please")
        with pytest.raises(InConflict):
            blinkline.upsert(laser("C-1", power_w=0.4))
        returned = blinkline.return_(submitted, "measure again")
        approved = blinkline.approve(blinkline.submit(returned), review_due="2028-01-01")
        assert (approved.status, approved.review_due) == ("approved", "2028-01-01")
        assert [r.state for r in blinkline.revisions(made.id)] == ["approved", "superseded"]
        blinkline.add_eyewear(PAIR)
        assert blinkline.eyewear_for(made.id)[0].sufficient
        with pytest.raises(Missing):
            blinkline.laser(999)
        with pytest.raises(Invalid) as refused:
            blinkline.create({"asset_tag": "x", "request": {"lines": []}})
        assert refused.value.problem.errors[0].field == "request.lines"
        assert [x.asset_tag for x in blinkline.lasers(q="c-1", overdue=False)] == ["C-1"]


def test_the_asynchronous_client_on_the_wire(url: str) -> None:
    async def run() -> list[str]:
        async with AsyncClient(url) as blinkline:
            done = await asyncio.gather(*(blinkline.upsert(laser(f"A-{n}")) for n in range(8)))
            assert {d for _, d in done} == {"created"}
            return [x.asset_tag async for x in blinkline.lasers(q="a-")]

    assert asyncio.run(run()) == [f"A-{n}" for n in range(8)]


def test_the_inventory_script_of_the_readme(
    url: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Runs as printed, for 200 lasers; class and distance of the contract's example among them."""
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    (script,) = (b for b in re.findall(r"```python\n(.*?)```", text, re.DOTALL) if "service.client" in b)
    head = "tag,name,room,wavelength_nm,power_w,diameter_mm,divergence_mrad\n"
    powers = [0.1 if n == 7 else 0.0001 * n + 1e-5 for n in range(200)]
    rows = [f"INV-{n:03d},Laser {n},Room {n % 9},532,{p},2,1" for n, p in enumerate(powers)]
    (tmp_path / "lasers.csv").write_text(head + "\n".join(rows))
    monkeypatch.chdir(tmp_path)
    out = io.StringIO()
    with redirect_stdout(out):
        exec(compile(script.replace("http://127.0.0.1:8321", url), "README", "exec"), {})
    lines = out.getvalue().splitlines()
    assert len(lines) == 200
    # From the README: 99.8 m for this laser, class 3B.
    assert lines[7].startswith("INV-007 created 3B 99.75")


def failing(*answers: int | Exception) -> tuple[httpx.MockTransport, list[httpx.Request]]:
    """A service that answers so, one after the other, then with an empty page."""
    left, seen = list(answers), []

    def handle(request: httpx.Request) -> httpx.Response:
        seen.append(request)
        now = left.pop(0) if left else 200
        if isinstance(now, Exception):
            raise now
        if now == 200:
            return httpx.Response(200, json={"items": [], "next": None, "total": 0})
        body = {"type": "/problems/x", "title": "t", "status": now, "detail": "d", "errors": []}
        return httpx.Response(now, json=body)

    return httpx.MockTransport(handle), seen


@pytest.fixture(autouse=True)
def quick(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(calls, "PAUSE_S", 0.001)


def test_what_passes_by_is_tried_again() -> None:
    transport, seen = failing(503, 429, httpx.ConnectError("no"), httpx.ReadTimeout("slow"))
    assert list(Client(transport=transport).lasers()) == []
    assert len(seen) == 5
    transport, _ = failing(*[503] * 9)
    with pytest.raises(Busy):
        list(Client(transport=transport, retries=2).lasers())
    transport, _ = failing(*[httpx.ConnectError("no")] * 9)
    with pytest.raises(Unreachable):
        list(Client(transport=transport, retries=2).lasers())


def test_a_creation_is_tried_again_under_one_key() -> None:
    transport, seen = failing(httpx.ReadTimeout("slow"), 422)
    with pytest.raises(Invalid):
        Client(transport=transport).create(laser())
    keys = {r.headers["idempotency-key"] for r in seen}
    assert (len(seen), len(keys)) == (2, 1)


def test_a_change_whose_answer_is_lost_is_not_sent_twice() -> None:
    transport, seen = failing(httpx.ReadTimeout("slow"))
    found = Client(transport=failing()[0])
    assert found.find("x") is None
    with pytest.raises(Unreachable):
        Client(transport=transport)._run(calls.step(_laser(), "submit", "", None))
    assert len(seen) == 1


def _laser() -> Any:
    class Some:
        id, version, revision = 1, 2, 3

    return Some()


def test_refusals_have_types_and_tokens_travel() -> None:
    kinds = {401: NotAllowed, 403: NotAllowed, 404: Missing, 409: InConflict, 412: Stale}
    for status, kind in kinds.items():
        transport, seen = failing(status)
        with pytest.raises(kind) as refused:
            Client(token="blk_secret", transport=transport).find("x")
        assert refused.value.problem.status == status
        assert "blk_secret" not in str(refused.value)
        assert seen[0].headers["authorization"] == "Bearer blk_secret"
    broken = httpx.MockTransport(lambda _: httpx.Response(500, text="<html>"))
    with pytest.raises(calls.ProblemError, match="500"):
        Client(transport=broken).find("x")
