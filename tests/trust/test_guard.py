"""Known hosts, fair rates, room to compute and slow bodies: refused early, as problem documents."""

from __future__ import annotations

import asyncio
from typing import Any

import httpx
import pytest
from starlette.types import Message

from service.app import create_app
from service.settings import Settings, SettingsError
from service.web.guard import _Rates
from tests.web.client import EVALUATE, GOOD, JSON
from tests.web.shape import assert_problem


def ask(settings: Settings, *requests: dict[str, Any], host: str = "lasers.example") -> list[httpx.Response]:
    """The answers to requests sent at the same time."""

    async def run() -> list[httpx.Response]:
        transport = httpx.ASGITransport(create_app(settings))
        async with httpx.AsyncClient(transport=transport, base_url=f"http://{host}") as client:
            return await asyncio.gather(*(client.request(**r) for r in requests))

    return asyncio.run(run())


LIVE = {"method": "GET", "url": "/health/live"}
RULES = {"method": "GET", "url": "/api/v1/rules"}
POST = {"method": "POST", "url": EVALUATE, "json": GOOD}


@pytest.mark.parametrize(
    ("allowed", "host", "status"),
    [
        ("", "anything.example", 200),
        ("lasers.example", "lasers.example", 200),
        ("other.example, lasers.example", "LASERS.example:8321", 200),
        ("[::1]", "[::1]:8321", 200),
        ("lasers.example", "evil.example", 421),
        ("lasers.example", "lasers.example.evil.example", 421),
    ],
)
def test_hosts(allowed: str, host: str, status: int) -> None:
    (answer,) = ask(Settings(allowed_hosts=allowed), {**RULES, "headers": {"host": host}})
    assert answer.status_code == status
    if status == 421:
        assert_problem(answer, 421)
        assert "default-src 'none'" in answer.headers["content-security-policy"]


def test_probes_are_answered_under_any_host() -> None:
    (answer,) = ask(Settings(allowed_hosts="lasers.example"), LIVE, host="10.0.0.7")
    assert answer.status_code == 200


def test_more_than_the_rate_is_refused_with_the_time_to_wait() -> None:
    """8 a minute, a quarter of them at once: two pass, the third waits 60 / 8 = 7.5 s, said as 8."""
    answers = ask(Settings(rate_limit=8), RULES, RULES, RULES, LIVE)
    assert [a.status_code for a in answers] == [200, 200, 429, 200]
    assert_problem(answers[2], 429)
    assert answers[2].headers["retry-after"] == "8"


def test_rates_by_hand() -> None:
    """60 a minute: 15 at once, then one a second; each client has its own."""
    rates = _Rates(60)
    assert [rates.wait_s("a", 0.0) for _ in range(15)] == [0.0] * 15
    assert rates.wait_s("a", 0.0) == pytest.approx(1.0)
    assert rates.wait_s("b", 0.0) == 0.0
    assert rates.wait_s("a", 0.5) == pytest.approx(0.5)
    assert rates.wait_s("a", 1.0) == 0.0
    assert rates.wait_s("a", 1000.0) == 0.0


def test_no_rate_unless_set() -> None:
    assert {a.status_code for a in ask(Settings(), *[RULES] * 50)} == {200}


def test_overload_is_shed_and_the_rest_answered() -> None:
    """Room for 3: of 12 that come at once, 3 are computed and 9 are told to come again."""
    answers = ask(Settings(running_limit=3), *[RULES] * 12)
    assert [a.status_code for a in answers] == [200] * 3 + [503] * 9
    for answer in answers[3:]:
        assert_problem(answer, 503)
        assert answer.headers["retry-after"] == "1"


def test_requests_with_a_body_are_shed_too() -> None:
    answers = ask(Settings(running_limit=3), *[POST] * 12)
    assert {a.status_code for a in answers} == {200, 503}
    assert all("retry-after" in a.headers for a in answers if a.status_code == 503)


def asgi(settings: Settings, body: list[bytes], pause_s: float) -> list[Message]:
    """What the application sends when the parts of a body come with pauses."""
    app = create_app(settings)
    sent: list[Message] = []

    async def run() -> None:
        parts = iter(body)

        async def receive() -> Message:
            part = next(parts, None)
            if part is None:
                await asyncio.sleep(3600)
            await asyncio.sleep(pause_s)
            return {"type": "http.request", "body": part, "more_body": True}

        async def send(message: Message) -> None:
            sent.append(message)

        headers = [(k.encode(), v.encode()) for k, v in JSON.items()]
        scope = {
            "type": "http",
            "method": "POST",
            "path": EVALUATE,
            "raw_path": EVALUATE.encode(),
            "query_string": b"",
            "headers": headers,
            "client": ("192.0.2.1", 1),
            "server": ("lasers.example", 80),
            "scheme": "http",
            "http_version": "1.1",
        }
        await app(scope, receive, send)

    asyncio.run(run())
    return sent


def test_a_body_that_does_not_end_is_refused_in_time() -> None:
    start, *_ = asgi(Settings(request_time=1), [b"{"], 0.0)
    assert start["status"] == 408
    assert dict(start["headers"])[b"connection"] == b"close"


def test_a_client_that_trickles_is_refused_in_time() -> None:
    start, *_ = asgi(Settings(request_time=1), [b" "] * 100, 0.05)
    assert start["status"] == 408


@pytest.mark.parametrize(
    ("name", "text"),
    [
        ("RATE_LIMIT", "-1"),
        ("RATE_LIMIT", "often"),
        ("RUNNING_LIMIT", "0"),
        ("REQUEST_TIME", "0"),
        ("REQUEST_TIME", "1.5"),
    ],
)
def test_unusable_settings_are_named(name: str, text: str) -> None:
    with pytest.raises(SettingsError, match=f"BLINKLINE_{name} is '{text}'"):
        Settings.from_environment({f"BLINKLINE_{name}": text})


def test_a_large_body_that_comes_steadily_has_the_time_it_needs() -> None:
    """250 kB every 0.4 s for 2 s, where the limit is 1 s and 1 MB: then too large, not too slow."""
    start, *_ = asgi(Settings(request_time=1), [b" " * 250_000] * 5, 0.4)
    assert start["status"] == 413
