"""The loader of the class schemes is strict: one wrong thing in a copy of data/ refuses to load.

Each case changes one thing in a fresh copy. The digest of a scheme changes with every table it rests on.
"""

from __future__ import annotations

import re
import shutil
from pathlib import Path

import pytest

from service.rules.classes import CompiledScheme, compiled_schemes, load_scheme
from service.rules.tables import TableError, read_sources
from tests.rules.class_engine import IEC, SCHEMES, TABLES
from tests.rules.class_loader_cases import REFUSED
from tests.rules.edits import Case, cell, line_of, lines_of, text, write
from tests.rules.engine import DATA


@pytest.fixture
def data(tmp_path: Path) -> Path:
    """A copy of what the loader reads."""
    copy = tmp_path / "data"
    copy.mkdir()
    shutil.copy(DATA / "sources.toml", copy)
    shutil.copytree(DATA / "classes", copy / "classes")
    (copy / "rules").mkdir()
    shutil.copy(DATA / "rules" / "additivity.csv", copy / "rules")
    return copy


def load(data: Path) -> dict[str, CompiledScheme]:
    """What the service loads; read afresh."""
    return compiled_schemes.__wrapped__(data)


def digests(data: Path) -> dict[str, str]:
    sources = read_sources(data / "sources.toml")
    return {
        name: load_scheme(data / "classes" / name, data / "rules" / "additivity.csv", sources).digest
        for name in SCHEMES
    }


def case_id(case: Case) -> str:
    return f"{case.file}: {case.name}"


@pytest.mark.parametrize("case", REFUSED, ids=case_id)
def test_one_wrong_thing_is_refused(case: Case, data: Path) -> None:
    """The message names the folder and the file, the line of the row where there is one, and the reason."""
    path = data / "classes" / case.file
    case.edit(path)
    with pytest.raises(TableError) as caught:
        load(data)
    message = str(caught.value)
    found = re.match(r"(?P<file>\S+), line (?P<line>\d+): (?P<why>.+)", message, re.DOTALL)
    assert found, message
    assert re.search(case.words, message), message
    if case.at not in (None, "last", "any"):
        path = data / "classes" / case.at
    places = {f"{path.parent.name}/{path.name}"}
    if case.row is None and case.at in (None, "any"):
        # What does not fit its neighbour may be named in the table it does not fit.
        places |= {f"{path.parent.name}/{name}" for name in ("limits.csv", "factors.csv", "scheme.toml")}
    assert found["file"] in places, message
    if case.row:
        assert int(found["line"]) == line_of(path, case.row), message
    elif case.at == "last":
        assert int(found["line"]) == len(lines_of(path)), message


def test_the_copy_itself_loads_the_default_first(data: Path) -> None:
    assert tuple(load(data)) == SCHEMES


@pytest.mark.parametrize("scheme", SCHEMES)
@pytest.mark.parametrize("name", [*(f"{t}.csv" for t in TABLES), "scheme.toml"])
def test_the_digest_changes_with_every_table_of_its_scheme(scheme: str, name: str, data: Path) -> None:
    before = digests(data)
    path = data / "classes" / scheme / name
    if name.endswith(".toml"):
        text('title = "', 'title = "The ')(path)
    else:
        rows = lines_of(path)
        rows[1][rows[0].index("note")] += "x"
        write(path, rows)
    after = digests(data)
    assert {key for key in before if before[key] != after[key]} == {scheme}


def test_the_digest_changes_with_the_additivity_table(data: Path) -> None:
    before = digests(data)
    cell("180-315-with-180-315", "note", "x")(data / "rules" / "additivity.csv")
    after = digests(data)
    assert all(before[key] != after[key] for key in SCHEMES)


def test_the_digest_ignores_line_ends(data: Path) -> None:
    before = digests(data)
    for path in (data / "classes" / IEC).iterdir():
        path.write_bytes(path.read_bytes().replace(b"\r\n", b"\n").replace(b"\n", b"\r\n"))
    assert digests(data) == before


def test_every_scheme_reports_its_own_digest() -> None:
    found = digests(DATA)
    assert len(set(found.values())) == len(SCHEMES)
    assert all(re.fullmatch(r"sha256:[0-9a-f]{64}", d) for d in found.values())
