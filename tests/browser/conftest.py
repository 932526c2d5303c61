"""A running service and a real browser. Without chromium these tests are skipped, in CI they fail."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest
from playwright.sync_api import Browser, Page, sync_playwright

CHROMIUM = Path("/usr/bin/chromium")
FLAGS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]
#: Set by CI: a missing browser is then a failure.
REQUIRED = "TESTS_REQUIRE_EVERYTHING"


@pytest.fixture(scope="session")
def address() -> Iterator[str]:
    """Address of a service of this checkout on a free port."""
    command = [sys.executable, "-m", "service.cli", "serve", "--port", "0"]
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as process:
        assert process.stdout is not None
        yield process.stdout.readline().rpartition(" ")[2].strip()
        process.terminate()


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    """A browser for one module: its event loop must not outlive it, other tests run loops of their own."""
    if not CHROMIUM.exists():
        if os.environ.get(REQUIRED):
            pytest.fail(f"{CHROMIUM} is missing")
        pytest.skip("chromium is not installed")
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=str(CHROMIUM), args=FLAGS)
        yield browser
        browser.close()


@pytest.fixture
def page(browser: Browser, address: str) -> Iterator[Page]:
    """A page on the blank form; the test fails on any error in the console."""
    context = browser.new_context(viewport={"width": 1280, "height": 900}, base_url=address)
    page = context.new_page()
    errors: list[str] = []
    page.on("console", lambda m: errors.append(m.text) if m.type == "error" else None)
    page.on("pageerror", lambda e: errors.append(str(e)))
    page.goto("/")
    yield page
    context.close()
    refused = "the server responded with a status of 422"
    assert [e for e in errors if refused not in e] == []
