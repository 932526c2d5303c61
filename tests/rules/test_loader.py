"""The loader is strict: one wrong thing in a copy of data/ refuses to load, naming file and line.

Each case changes one thing in a fresh copy. The digest of a rule set changes with every table it rests on.
"""

from __future__ import annotations

import re
import shutil
from pathlib import Path

import pytest

from service.rules.compiled import CompiledRules
from service.rules.ruleset import load_all
from service.rules.tables import TableError
from tests.rules.edits import Case, cell, file_of, line_of, lines_of, text, write
from tests.rules.engine import ANSI, DATA, EU, ICNIRP, IEC, RULES, TABLES
from tests.rules.loader_cases import REFUSED


@pytest.fixture
def data(tmp_path: Path) -> Path:
    """A copy of what the loader reads."""
    copy = tmp_path / "data"
    copy.mkdir()
    shutil.copy(DATA / "sources.toml", copy)
    shutil.copytree(DATA / "rules", copy / "rules")
    return copy


def load(data: Path) -> dict[str, CompiledRules]:
    return {key: CompiledRules(rules) for key, rules in load_all(data).items()}


def refused(case: Case, data: Path) -> str:
    """The message of the refusal."""
    path = file_of(data, case.file)
    case.edit(path)
    with pytest.raises(TableError) as caught:
        load(data)
    return str(caught.value)


def case_id(case: Case) -> str:
    return f"{case.file.split('/')[-1]}: {case.name}"


@pytest.mark.parametrize("case", REFUSED, ids=case_id)
def test_one_wrong_thing_is_refused(case: Case, data: Path) -> None:
    """The message names the folder and the file, the line of the row where there is one, and the reason."""
    message = refused(case, data)
    named = case.at if case.at not in (None, "last") else case.file
    path = file_of(data, named)
    found = re.match(r"(?P<file>\S+), line (?P<line>\d+): (?P<why>.+)", message, re.DOTALL)
    assert found, message
    # A row that does not fit its neighbour may be named in the table it does not fit.
    places = {f"{path.parent.name}/{path.name}"}
    if case.row is None and case.at is None and case.file != "sources.toml":
        places |= {f"{ICNIRP}/limits.csv", f"{ICNIRP}/factors.csv", "rules/additivity.csv"}
    assert found["file"] in places, message
    assert re.search(case.words, message), message
    if case.row:
        assert int(found["line"]) == line_of(path, case.row), message
    elif case.at == "last":
        assert int(found["line"]) == len(lines_of(path)), message


def test_the_copy_itself_loads(data: Path) -> None:
    assert tuple(sorted(load(data))) == tuple(sorted(RULES))


# Digest


@pytest.mark.parametrize("rules", RULES)
@pytest.mark.parametrize("name", [*(f"{t}.csv" for t in TABLES), "ruleset.toml"])
def test_the_digest_changes_with_every_table_of_its_set(rules: str, name: str, data: Path) -> None:
    before = {key: r.digest for key, r in load_all(data).items()}
    path = data / "rules" / rules / name
    if name.endswith(".toml"):
        text('title = "', 'title = "The ')(path)
    else:
        rows = lines_of(path)
        rows[1][rows[0].index("note")] += "x"
        write(path, rows)
    after = {key: r.digest for key, r in load_all(data).items()}
    assert {key for key in before if before[key] != after[key]} == {rules}


def test_the_digest_changes_with_the_additivity_table(data: Path) -> None:
    before = {key: r.digest for key, r in load_all(data).items()}
    cell("180-315-with-180-315", "note", "x")(data / "rules" / "additivity.csv")
    after = {key: r.digest for key, r in load_all(data).items()}
    assert all(before[key] != after[key] for key in RULES)


def test_the_digest_ignores_line_ends(data: Path) -> None:
    before = {key: r.digest for key, r in load_all(data).items()}
    for path in (data / "rules").rglob("*.*"):
        content = path.read_bytes().replace(b"\r\n", b"\n")
        path.write_bytes(content.replace(b"\n", b"\r\n"))
    assert {key: r.digest for key, r in load_all(data).items()} == before


def test_every_rule_set_reports_its_own_digest() -> None:
    digests = {key: r.digest for key, r in load_all(DATA).items()}
    assert set(digests) == {ICNIRP, EU, IEC, ANSI}
    assert all(re.fullmatch(r"sha256:[0-9a-f]{64}", d) for d in digests.values())
    assert len(set(digests.values())) == 4
