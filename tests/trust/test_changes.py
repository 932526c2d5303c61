"""Changes: no table of published numbers changes without an entry."""

from __future__ import annotations

from pathlib import Path

import pytest

from service.contract import changes as module
from service.contract.changes import change_list, current_digests, unrecorded
from service.files import DATA
from service.rules.tables import TableError
from tests.web.client import Client, strict_json
from tests.web.pages import page

FILE = DATA / "changes.toml"


def test_every_table_has_the_digest_that_its_newest_entry_names() -> None:
    missing = unrecorded()
    lines = "\n".join(f'"{name}" = "{digest}"' for name, digest in missing.items())
    assert not missing, f"add an entry to data/changes.toml that says what moved and why, with\n{lines}"


def test_no_entry_names_a_table_that_is_not_there() -> None:
    named = {name for change in change_list() for name in change.digests}
    assert named <= set(current_digests())


def test_a_changed_digest_is_noticed(monkeypatch: pytest.MonkeyPatch) -> None:
    there = current_digests()
    monkeypatch.setattr(module, "current_digests", lambda: {**there, "eyewear": "sha256:0", "new.csv": "x"})
    assert unrecorded() == {"eyewear": "sha256:0", "new.csv": "x"}


def test_entries_stand_newest_first_and_say_everything(tmp_path: Path) -> None:
    assert all(c.what and c.effect and c.why for c in change_list())
    text = FILE.read_text(encoding="utf-8")
    for old, new in (
        ("day = 2026-12-01", "day = 2020-01-01"),
        ('why = "', 'because = "'),
        ("[[change]]", "[[changed]]"),
    ):
        faulty = tmp_path / "changes.toml"
        count = -1 if old == "[[change]]" else 1
        faulty.write_text(text.replace(old, new, count), encoding="utf-8")
        with pytest.raises(TableError):
            change_list(faulty)


def test_page_and_json_tell_the_same(client: Client) -> None:
    body = page(client, "/changes").one("main").text
    told = strict_json(client.get("/api/v1/changes").text)
    assert len(told) == len(change_list())
    for change in told:
        assert change["what"] in body
        assert change["effect"] in body
