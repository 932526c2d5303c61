"""Published checks: all met by the running service, shown as they are, and loud when one is not met."""

from __future__ import annotations

from pathlib import Path

import pytest

from service.contract import checks as module
from service.contract.checks import SUBJECTS, Newer, PublishedCheck, checks, published_checks
from service.files import DATA
from service.rules.tables import TableError
from service.web import health, trust_api, trust_pages
from tests.web.client import Client, strict_json
from tests.web.pages import HTML, page
from tests.web.shape import assert_problem

TABLE = DATA / "checks" / "published.toml"


def test_every_published_value_is_met() -> None:
    found = checks()
    assert found.failed == []
    assert found.met == len(found.checks) >= 95


def test_the_verdict_is_the_deviation_against_what_is_allowed() -> None:
    for c in checks().checks:
        assert c.computed is not None
        assert c.deviation == pytest.approx(c.computed - c.expected, abs=1e-300)
        assert c.met == (abs(c.deviation) <= c.allowed * (1 + 1e-9) + 1e-12 * abs(c.expected))
        assert c.expected == c.printed or c.replaced_by


def test_every_subject_has_checks_and_filters(client: Client) -> None:
    everything = strict_json(client.get("/api/v1/checks").text)
    assert {c["subject"] for c in everything["checks"]} == set(SUBJECTS)
    total = 0
    for subject in SUBJECTS:
        part = strict_json(client.get("/api/v1/checks", params={"subject": subject}).text)["checks"]
        assert {c["subject"] for c in part} == {subject}
        total += len(part)
        body = page(client, f"/checks?subject={subject}").one("main")
        assert len(body.all("tr", id=part[0]["id"])) == 1
    assert total == len(everything["checks"])


def test_an_unknown_subject_is_a_problem(client: Client) -> None:
    assert_problem(client.get("/api/v1/checks?subject=nose"), 404)
    assert page(client, "/checks?subject=nose", status=404)


def test_the_page_shows_printed_and_computed_value_with_source(client: Client) -> None:
    """1064 nm, 10 ns: the directive prints 5e-2 J/m2 (read)."""
    row = page(client, "/checks").one("tr", id="LAW-1064-NS")
    values = [e.attributes["value"] for e in row.all("data")]
    assert values[:3] == ["0.05", "0.05", "0.0"]
    assert "Directive 2006/25/EC" in row.text
    assert row.one("span", class_="tag met").text == "met"


@pytest.fixture
def one_broken(monkeypatch: pytest.MonkeyPatch) -> None:
    """One printed value, changed by a tenth."""
    wrong = {k: c for k, c in published_checks().items() if k in ("AVI-6W-NOHD", "LAW-2100")}
    old = wrong["LAW-2100"]
    fields = {f: getattr(old, f) for f in old.__dataclass_fields__}
    wrong["LAW-2100"] = PublishedCheck(**{**fields, "printed_value": 1100.0})
    monkeypatch.setattr(module, "published_checks", lambda: wrong)
    found = module.checks.__wrapped__()
    for user in (health, trust_api, trust_pages):
        monkeypatch.setattr(user, "checks", lambda: found)
    return


@pytest.mark.usefixtures("one_broken")
def test_one_unmet_check_is_loud(client: Client) -> None:
    answer = client.get("/checks", headers=HTML)
    assert answer.status_code == 503
    assert "NOT MET" in answer.text
    assert 'role="alert"' in answer.text
    assert client.get("/api/v1/checks").status_code == 503
    ready = client.get("/health/ready")
    assert ready.status_code == 503
    assert strict_json(ready.text)["failed_checks"] == ["LAW-2100"]
    assert client.get("/health/live").status_code == 200


def test_a_check_that_cannot_be_computed_is_not_met() -> None:
    check = published_checks()["LAW-2100"]
    fields = {f: getattr(check, f) for f in check.__dataclass_fields__}
    broken = PublishedCheck(**{**fields, "ask": {**check.ask, "wavelength_nm": -1}})
    (result,) = module._results(broken)
    assert (result.met, result.computed, result.deviation) == (False, None, None)


def test_ready_when_all_is_met(client: Client) -> None:
    ready = client.get("/health/ready")
    assert ready.status_code == 200
    assert strict_json(ready.text)["failed_checks"] == []


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ('id = "LAW-UV305"', 'id = "LAW-UV303"', "stands twice"),
        ('subject = "factors"', 'subject = "feet"', "subject 'feet'"),
        ('unit = "s"', 'unit = "h"', "unit 'h'"),
        ('known = "read"', 'known = "guess"', "neither read nor memory"),
        ('trust = "A"', 'trust = "A"\nshoe = 1', "shoe"),
        ('read = "crossover"', 'read = "oracle"', "ask.read"),
        ("formula = ", "# formula = ", "formula"),
    ],
)
def test_a_faulty_table_is_refused(tmp_path: Path, old: str, new: str, words: str) -> None:
    text = TABLE.read_text(encoding="utf-8")
    assert old in text
    faulty = tmp_path / "published.toml"
    faulty.write_text(text.replace(old, new, 1), encoding="utf-8")
    with pytest.raises(TableError, match=words):
        published_checks(faulty)


def test_newer_values_say_what_replaced_the_printed_one() -> None:
    newer = [c.newer for c in published_checks().values() if c.newer]
    assert len(newer) == 10
    assert all(isinstance(n, Newer) and n.reason for n in newer)
