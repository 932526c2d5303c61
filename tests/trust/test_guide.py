"""The guide: every setting, address, field and column is explained, and its examples print what they say."""

from __future__ import annotations

import contextlib
import csv
import html
import io
import re
import sys
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest

from service.app import create_app
from service.files import DATA
from service.web.guide import TOPICS, examples, guide_table, input_fields, paths_of, settings_table
from tests.web.client import Client
from tests.web.pages import HTML, page
from tests.web.shape import assert_problem

ROOT = Path(__file__).resolve().parents[2]


def test_every_setting_is_explained_here_and_in_the_readme() -> None:
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    for setting in settings_table():
        assert setting.meaning, f"say in data/guide/settings.toml what {setting.variable} means"
        assert f"`{setting.variable}`" in readme, f"{setting.variable} is missing in README.md"
    known = {s.variable.removeprefix("BLINKLINE_").lower() for s in settings_table()}
    assert set(guide_table("settings")) == known


def test_every_address_is_explained() -> None:
    paths = set(paths_of(create_app()))
    explained = {path for path, text in guide_table("routes").items() if text}
    assert not paths - explained, f"say in data/guide/routes.toml what these are for: {paths - explained}"
    assert not explained - paths, f"data/guide/routes.toml explains what is not there: {explained - paths}"


def test_every_input_is_explained() -> None:
    fields = input_fields()
    silent = [f"[{f.part}] {f.name}" for f in fields if not f.meaning]
    assert not silent, f"say in data/guide/inputs.toml what these mean: {silent}"
    known = {(f.part, f.name) for f in fields}
    told = {(part, name) for part, words in guide_table("inputs").items() for name in words}
    assert told == known


def test_every_column_is_explained() -> None:
    columns: set[str] = set()
    for path in DATA.rglob("*.csv"):
        with path.open(encoding="utf-8", newline="") as handle:
            columns |= set(next(csv.reader(handle)))
    explained = set(guide_table("columns"))
    assert not columns - explained, f"say in data/guide/columns.toml what these hold: {columns - explained}"
    assert not explained - columns, (
        f"data/guide/columns.toml explains what is not there: {explained - columns}"
    )


@pytest.mark.parametrize("topic", TOPICS)
def test_pages(client: Client, topic: str) -> None:
    tree = page(client, f"/guide/{topic}".rstrip("/"))
    assert tree.one("h1").text
    (here,) = tree.one("main").all("a", aria_current="page")
    assert here.text == TOPICS[topic]


def test_links_of_the_guide_lead_somewhere(client: Client) -> None:
    for topic in TOPICS:
        tree = page(client, f"/guide/{topic}".rstrip("/"))
        for link in tree.all("a"):
            if (to := link.attributes["href"]).startswith("/"):
                # Without sign-in the register answers this machine alone, which the test client is not.
                found = client.get(to, headers=HTML).status_code
                assert found in (200, 303) or (to == "/lasers" and found == 403), to


def test_no_such_page(client: Client) -> None:
    assert_problem(client.get("/guide/nowhere"), 404)


class Through(ModuleType):
    """httpx as the examples use it, with the application of the tests behind it."""

    def __init__(self, client: Client) -> None:
        super().__init__("httpx")
        self.client = client

    def get(self, url: str, **more: Any) -> Any:
        return self.client.get(url, **more)

    def post(self, url: str, **more: Any) -> Any:
        return self.client.post(url, **more)


@pytest.mark.parametrize("number", range(len(examples())), ids=[e["title"] for e in examples()])
def test_an_example_prints_what_it_says(client: Client, monkeypatch: pytest.MonkeyPatch, number: int) -> None:
    """The code as the page shows it; what it prints is known from elsewhere, as the page says."""
    shown = client.get("/guide/api", headers=HTML).text
    codes = re.findall(r'<pre tabindex="0" class="code"><code>(.*?)</code>', shown, re.DOTALL)
    monkeypatch.setitem(sys.modules, "httpx", Through(client))
    printed = io.StringIO()
    with contextlib.redirect_stdout(printed):
        exec(compile(html.unescape(codes[number]), "example", "exec"), {})
    assert printed.getvalue().strip() == examples()[number]["says"]


def test_the_worked_example_of_the_first_page(client: Client) -> None:
    """Its figures by hand stand in tests/published/test_contract_example.py; the link shows the same."""
    link = next(a for a in page(client, "/guide").all("a") if a.text == "see it evaluated")
    text = page(client, link.attributes["href"]).one("main").text
    assert "99.8" in text
    assert "2.01" in text
