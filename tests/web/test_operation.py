"""Operation: numbers for monitoring, several workers, stopping without losing an answer, log lines."""

from __future__ import annotations

import json
import logging
import os
import re
import signal
import subprocess
import sys
import threading
import time
from pathlib import Path

import httpx
import pytest

from service.logs import configure
from service.settings import Settings, SettingsError
from tests.web.client import EVALUATE, GOOD, Client
from tests.web.test_cli import COMMAND, PATIENCE_S, assert_one_line, environment, run, serving

BULK = "/api/v1/evaluate/bulk"


def counted(text: str) -> dict[str, float]:
    """Value by name and labels."""
    rows = [line.rpartition(" ") for line in text.splitlines() if not line.startswith("#")]
    return {name: float(value) for name, _, value in rows}


def requests_of(route: str, method: str, status: int) -> str:
    return f'blinkline_requests_total{{method="{method}",route="{route}",status="{status}"}}'


def test_requests_are_counted_by_route(client: Client) -> None:
    """The label is the template: an address of the caller's choice makes no label of its own."""
    names = [
        requests_of(EVALUATE, "POST", 200),
        requests_of("/api/v1/rules/{rules_id}", "GET", 200),
        requests_of("unknown", "GET", 404),
    ]
    before = counted(client.get("/metrics").text)
    client.evaluate(GOOD)
    client.get("/api/v1/rules/eu-2006-25")
    client.get("/no/such/address")
    client.request("BREW", "/no/such/address")
    answer = client.get("/metrics")
    after = counted(answer.text)
    assert answer.headers["content-type"].startswith("text/plain")
    for name in names:
        assert after[name] == before.get(name, 0.0) + 1.0, name
    assert "/no/such/address" not in answer.text
    assert "BREW" not in answer.text
    assert after[f'blinkline_request_seconds_count{{route="{EVALUATE}"}}'] >= 1.0
    assert after["blinkline_requests_running"] == 1.0


def test_workers_share_address_and_numbers(tmp_path: Path) -> None:
    with serving(tmp_path, "--port", "0", "--workers", "2") as url, httpx.Client(timeout=PATIENCE_S) as http:
        answers = [httpx.post(f"{url}{EVALUATE}", json=GOOD, timeout=PATIENCE_S) for _ in range(12)]
        end = time.monotonic() + PATIENCE_S
        while True:
            # A worker counts a request just after its answer has left.
            number = counted(http.get(f"{url}/metrics").text)[requests_of(EVALUATE, "POST", 200)]
            if number >= len(answers) or time.monotonic() > end:
                break
    assert {answer.status_code for answer in answers} == {200}
    assert len({answer.text for answer in answers}) == 1
    assert number == len(answers)


def test_a_signal_to_stop_finishes_what_runs(tmp_path: Path) -> None:
    """Stopped while a large answer is under way: it arrives whole, and then the process ends."""
    process = subprocess.Popen(
        [COMMAND, "serve", "--port", "0"],
        cwd=tmp_path,
        env=environment(),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )
    assert process.stdout is not None
    found = re.search(r"http://\S+", process.stdout.readline())
    assert found
    sent = (json.dumps(GOOD) + "\n").encode() * 8000
    headers = {"content-type": "application/x-ndjson", "accept-encoding": "identity"}
    with httpx.stream(
        "POST", f"{found[0]}{BULK}", content=sent, headers=headers, timeout=PATIENCE_S
    ) as answer:
        pieces = answer.iter_bytes()
        text = next(pieces)
        process.send_signal(signal.SIGTERM)
        for piece in pieces:
            text += piece
    _, errors = process.communicate(timeout=PATIENCE_S)
    *records, closing = text.splitlines()
    assert len(records) == 8000
    assert json.loads(closing)["closing"]["answered"] == 8000
    assert "Traceback" not in errors


def test_one_evaluation_is_answered_beside_a_large_one(tmp_path: Path) -> None:
    """A stream of many is computed off the event loop: single requests go on meanwhile."""
    sent = (json.dumps(GOOD) + "\n").encode() * 20_000
    headers = {"content-type": "application/x-ndjson", "accept-encoding": "identity"}
    with serving(tmp_path, "--port", "0") as url:
        ended = threading.Event()

        def stream() -> None:
            httpx.post(f"{url}{BULK}", content=sent, headers=headers, timeout=PATIENCE_S)
            ended.set()

        thread = threading.Thread(target=stream)
        thread.start()
        meanwhile = 0
        while not ended.is_set():
            assert httpx.get(f"{url}/health/live", timeout=PATIENCE_S).status_code == 200
            meanwhile += 1
        thread.join()
    assert meanwhile > 3


@pytest.mark.parametrize("workers", ["0", "65", "-1"])
def test_an_impossible_number_of_workers(tmp_path: Path, workers: str) -> None:
    assert_one_line(run(tmp_path, "serve", "--workers", workers), "--workers", "1 to 64")


def test_log_lines_are_json(capsys: pytest.CaptureFixture[str]) -> None:
    root = logging.getLogger()
    handlers, level = root.handlers[:], root.level
    try:
        configure("json")
        try:
            raise ArithmeticError("made to fail")
        except ArithmeticError:
            logging.getLogger("blinkline").exception("request failed: %s", "GET\n/")
        (line,) = capsys.readouterr().err.splitlines()
    finally:
        root.handlers[:] = handlers
        root.setLevel(level)
    found = json.loads(line)
    assert (found["level"], found["logger"], found["process"]) == ("error", "blinkline", os.getpid())
    assert found["message"] == "request failed: GET\n/"
    assert "made to fail" in found["exception"]


def test_the_form_of_the_log_is_a_setting() -> None:
    assert Settings.from_environment({"BLINKLINE_LOG": "json"}).log == "json"
    with pytest.raises(SettingsError, match="text, json"):
        Settings.from_environment({"BLINKLINE_LOG": "xml"})


def test_the_service_does_not_load_what_only_clusters_need() -> None:
    code = "import sys, service.cli, service.columns; assert not {'dask', 'distributed'} & {*sys.modules}"
    subprocess.run([sys.executable, "-c", code], check=True, timeout=PATIENCE_S)
