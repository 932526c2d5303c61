"""Requests generated from the OpenAPI document, fitting it and not fitting it, and what every answer must be.

``python -m tests.fuzz.schema 20000`` sends so many requests and prints counts by operation and status.
"""

from __future__ import annotations

import contextlib
import sys
import time
import warnings
from collections import Counter
from typing import Any

import httpx
from hypothesis import HealthCheck, Phase, given, seed, settings
from hypothesis.errors import Unsatisfiable

from service.app import create_app
from service.settings import Settings
from tests.web.client import Client, strict_json

with warnings.catch_warnings():
    warnings.simplefilter("ignore")
    import schemathesis
    from schemathesis import GenerationMode

__all__ = ["MODES", "answer_is_sound", "operations", "send_many"]

MODES = (GenerationMode.POSITIVE, GenerationMode.NEGATIVE)


def operations() -> list[Any]:
    """Every operation of the OpenAPI document."""
    document = create_app(Settings()).openapi()
    schema = schemathesis.openapi.from_dict(document)
    return [found.ok() for found in schema.get_all_operations()]


def answer_is_sound(response: httpx.Response, what: str) -> None:
    """No failure; every refusal is a problem document; JSON without NaN; the policy on every answer."""
    assert response.status_code < 500, f"{what}: {response.text[:300]}"
    assert "default-src 'none'" in response.headers["content-security-policy"], what
    media = response.headers.get("content-type", "")
    if response.status_code >= 400:
        assert media == "application/problem+json", f"{what}: {media}"
        assert strict_json(response.text)["status"] == response.status_code, what
    elif media.startswith("application/json"):
        strict_json(response.text)


def send_many(client: Client, operation: Any, mode: GenerationMode, count: int, start: int) -> Counter[int]:
    """Send `count` generated requests; the statuses counted. Raises AssertionError on an unsound answer."""
    statuses: Counter[int] = Counter()

    @seed(start)
    @settings(
        max_examples=count,
        database=None,
        deadline=None,
        phases=[Phase.generate],
        suppress_health_check=list(HealthCheck),
    )
    @given(case=operation.as_strategy(generation_mode=mode))
    def one(case: Any) -> None:
        given_body = case.as_transport_kwargs(base_url="http://blinkline.test")
        wanted = {
            k: v for k, v in given_body.items() if k in ("json", "data", "params", "headers", "cookies")
        }
        if isinstance(wanted.get("data"), bytes | str):
            wanted["content"] = wanted.pop("data")
        request = httpx.Request(given_body["method"], given_body["url"], **wanted)
        response = client.send(request)
        statuses[response.status_code] += 1
        answer_is_sound(response, f"{given_body['method']} {given_body['url']} {str(wanted)[:300]}")

    with warnings.catch_warnings(), contextlib.suppress(Unsatisfiable):  # nothing misfits an empty request
        warnings.simplefilter("ignore")
        one()
    return statuses


def main(total: int) -> None:
    """Send `total` requests over all operations and print what came back.

    Operations without parameters have few different requests; what they leave is shared by the others.
    """
    client, left = Client(), total
    begin, sum_of_all = time.perf_counter(), Counter[int]()
    found = sorted(operations(), key=lambda o: (o.method == "post", len(o.path)))
    jobs = [(operation, mode) for operation in found for mode in MODES]
    for n, (operation, mode) in enumerate(jobs):
        sent = Counter[int]()
        share = left // (len(jobs) - n)
        for start in range(50):
            if (missing := share - sum(sent.values())) <= 0:
                break
            new = send_many(client, operation, mode, missing, 1000 * n + start)
            sent += new
            if sum(new.values()) < min(missing, 5):
                break
        left -= sum(sent.values())
        sum_of_all += sent
        print(f"{operation.label:40} {mode.value:9} {dict(sorted(sent.items()))}", flush=True)
    seconds = time.perf_counter() - begin
    print(f"{sum(sum_of_all.values())} requests in {seconds:.0f} s: {dict(sorted(sum_of_all.items()))}")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 20_000)
