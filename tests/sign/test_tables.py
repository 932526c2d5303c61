"""The tables of signs are read strictly, and say something for every class and in every language."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from service.contract.classification import schemes
from service.files import DATA
from service.rules.tables import TableError
from service.sign.tables import load_tables, sign_tables


@pytest.fixture
def data(tmp_path: Path) -> Path:
    shutil.copytree(DATA / "signs", tmp_path / "signs")
    shutil.copy(DATA / "sources.toml", tmp_path)
    return tmp_path


@pytest.mark.parametrize(
    ("file", "old", "new", "said"),
    [
        ("symbol.toml", "margin = 0.02", "margin = 0.02\nhue = 1", "hue"),
        ("symbol.toml", "margin = 0.02", "", "margin"),
        ("symbol.toml", 'source = "iec-60825-1-2014"', 'source = "nobody"', "nobody"),
        ("symbol.toml", 'known = "memory"', 'known = "maybe"', "known"),
        ("words.toml", 'word = "warning"', 'word = "beware"', "beware"),
        ("words.toml", 'level = "3B"', 'level = "9"', "levels"),
        ("words.toml", '"caution", "notice"]', '"caution"]', "signal words"),
        ("words.toml", 'danger = ["3B", "4"]', 'danger = ["5"]', "5"),
        ("sheets.toml", "A3 = [297, 420]", "A3 = [297]", "A3"),
        ("phrases/de.toml", 'room = "Raum"', "", "room"),
        ("phrases/de.toml", 'room = "Raum"', 'room = " "', "room"),
        ("phrases/de.toml", "LASER KLASSE {}", "LASER KLASSE", "class"),
        ("phrases/fr.toml", 'decimal = ","', 'decimal = ";"', "decimal"),
        ("phrases/it.toml", "[signal]", "[signal", "it.toml"),
    ],
)
def test_a_faulty_table_is_refused(data: Path, file: str, old: str, new: str, said: str) -> None:
    path = data / "signs" / file
    text = path.read_text(encoding="utf-8")
    assert old in text
    path.write_text(text.replace(old, new, 1), encoding="utf-8")
    with pytest.raises(TableError, match=said) as caught:
        load_tables(data)
    assert Path(file).name in str(caught.value)


def test_every_class_of_every_scheme_has_words() -> None:
    tables = sign_tables()
    for key, compiled in schemes().items():
        for rule in compiled.scheme.classes:
            assert tables.class_words(key, rule.name).word in tables.words.signal


def test_signal_words_by_class() -> None:
    """ANSI Z136.1-2014 (read on a sign-trade page): CAUTION 2, 2M, 3R; WARNING 3B and most of 4."""
    tables = sign_tables()
    found = {n: tables.class_words("iec-60825-1-2014", n).word for n in ("2", "2M", "3R", "3B", "4")}
    assert found == {"2": "caution", "2M": "caution", "3R": "caution", "3B": "warning", "4": "warning"}


def test_languages_and_who_checks_them() -> None:
    phrases = sign_tables().phrases
    assert list(phrases) == ["en", "de", "es", "fr", "it", "nl"]
    assert all(p.check.strip() for p in phrases.values())
    # Every language has its own class sentences.
    for level in phrases["en"].sentence:
        assert len({p.sentence[level] for p in phrases.values()}) == 6


def test_paper_sizes() -> None:
    """ISO 216, and ANSI/ASME Y14.1 size A: 8.5 x 11 in."""
    sheets = sign_tables().sheets.sheet
    sizes = {"A3": (297, 420), "A4": (210, 297), "A5": (148, 210), "A6": (105, 148), "Letter": (215.9, 279.4)}
    assert sheets == sizes
