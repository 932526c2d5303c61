"""Typesetting: PDF, SVG and PNG from a template and data, the same bytes each time, text stays text."""

from __future__ import annotations

import io
import threading
import unicodedata
from collections.abc import Iterator
from datetime import date
from pathlib import Path

import pdfplumber
import pytest
import typst

from service.web import typeset
from service.web.typeset import FONTS, TypesetError, Unprintable, unprintable

DAY = date(2026, 12, 1)
TEMPLATE = """
#import "/typst/house.typ": font, page-number
#let data = json(bytes(sys.inputs.data))
#set document(title: data.title)
#set page(width: 100mm, height: 60mm, footer: page-number(before: "page "))
#set text(font: font, lang: data.lang, fallback: false)
#if "refuse" in data { panic("refused: " + data.refuse) }
= #data.title
#for text in data.texts [#text #pagebreak(weak: true)]
"""
DATA = {"title": "Trial", "lang": "en", "texts": ["one", "two"]}


@pytest.fixture
def template(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Iterator[str]:
    """A template of this test beside those of the service."""
    (tmp_path / "trial.typ").write_text(TEMPLATE, encoding="utf-8")
    (tmp_path / "typst").symlink_to(typeset.TEMPLATES / "typst")
    monkeypatch.setattr(typeset, "TEMPLATES", tmp_path)
    monkeypatch.setattr(typeset, "_own", threading.local())
    return "trial.typ"


def texts(document: bytes) -> list[str]:
    with pdfplumber.open(io.BytesIO(document)) as opened:
        return [page.extract_text() for page in opened.pages]


def test_pdf_is_tagged_with_title_language_and_fonts(template: str) -> None:
    document = typeset.pdf(template, DATA, DAY)
    with pdfplumber.open(io.BytesIO(document)) as opened:
        catalog = opened.doc.catalog
        assert opened.metadata["Title"] == "Trial"
        assert opened.metadata["CreationDate"].startswith("D:20261201")
        assert catalog["Lang"] == b"en"
        assert catalog["MarkInfo"]["Marked"] is True
        names = {c["fontname"].partition("+")[2] for page in opened.pages for c in page.chars}
    assert b"<pdfuaid:part>1</pdfuaid:part>" in document
    assert names == {"SourceSansPro-Regular", "SourceSansPro-Bold"}
    assert b"/FontFile3" in document or b"/FontFile2" in document
    assert texts(document) == ["Trial\none\npage 1 / 2", "two\npage 2 / 2"]


def test_the_same_input_gives_the_same_bytes(template: str) -> None:
    first, other = typeset.pdf(template, DATA, DAY), typeset.pdf(template, DATA, date(2026, 12, 2))
    assert first == typeset.pdf(template, DATA, DAY)
    assert first != other


def test_every_page_is_a_picture(template: str) -> None:
    drawn = typeset.pages(template, DATA, DAY, "svg")
    assert [page[:4] for page in drawn] == [b"<svg", b"<svg"]
    (first, _) = typeset.pages(template, DATA, DAY, "png", 254.0)
    assert first[:8] == b"\x89PNG\r\n\x1a\n"
    # 100 mm at 254 dots per inch are 1000 dots: IHDR carries width and height.
    assert (int.from_bytes(first[16:20]), int.from_bytes(first[20:24])) == (1000, 600)


@pytest.mark.parametrize(
    "text",
    ['#read("/etc/passwd")', "<script>alert(1)</script>", "*b* _i_ `c` $x$ = h", "// no \\ comment", "@ref"],
)
def test_text_stays_text(template: str, text: str) -> None:
    # Left to right as typed; an ASCII quote may be set as a curly one.
    (page,) = texts(typeset.pdf(template, {**DATA, "texts": [text]}, DAY))
    found = page.splitlines()[1].replace("“", '"').replace("”", '"').replace("’", "'")
    assert found == text


@pytest.mark.parametrize("form", ["pdf", "png"])
@pytest.mark.parametrize(
    ("text", "characters"),
    [
        ("שלום", list("שלום")),
        ("beam \U0001f600", ["\U0001f600"]),
        ("a\u202eb", ["\u202e"]),
        ("a\u200bb", ["\u200b"]),
        ("a\x00b", ["\x00"]),
        ("a\u2028b", ["\u2028"]),
    ],
)
def test_what_the_font_lacks_and_what_hides_is_refused(
    template: str, form: str, text: str, characters: list[str]
) -> None:
    data = {**DATA, "texts": ["fine", text]}
    with pytest.raises(Unprintable) as caught:
        typeset.pdf(template, data, DAY) if form == "pdf" else typeset.pages(template, data, DAY, "png")
    assert caught.value.path == "texts.1"
    assert caught.value.characters == characters


def test_the_words_of_science_can_be_printed() -> None:
    assert unprintable("ÄÖÜäöüß àâçéèêëîïôœùûÿ áéíóúñ¿¡ ìò µ Ω λ α π ² ³ · × – ≤ ≥ → « » „ “ ”\n") == []


def test_glyphs_agree_with_the_typesetter() -> None:
    """Every code point of Latin, Greek and punctuation that the map names can be set, and no other."""
    source = '#set text(font: "Source Sans Pro", fallback: false)\n#set document(title: "t")\n'
    source += "#json(bytes(sys.inputs.t))"
    compiler = typst.Compiler(font_paths=[str(FONTS)], ignore_system_fonts=True)

    def sets(text: str) -> bool:
        try:
            compiler.compile(
                input=source.encode(), format="pdf", pdf_standards=["ua-1"], sys_inputs={"t": f'"{text}"'}
            )
        except typst.TypstError:
            return False
        return True

    codes = [c for c in (*range(0xA1, 0x250), *range(0x391, 0x3CA), *range(0x2190, 0x2200)) if c != 0xAD]
    known = "".join(chr(c) for c in codes if not unprintable(chr(c)))
    assert len(known) > 300
    assert sets(known)
    # What the font lacks can still be composed from parts it has, where it has parts: ǿ from o and an accent.
    lacking = [chr(c) for c in codes if unprintable(chr(c)) and not unicodedata.decomposition(chr(c))]
    assert not any(sets(character) for character in lacking[::7])


def test_a_refusal_carries_its_reason(template: str) -> None:
    with pytest.raises(TypesetError, match=r"^no room for the name$"):
        typeset.pdf(template, {**DATA, "refuse": "no room for the name"}, DAY)


def test_threads_do_not_meet(template: str) -> None:
    expected = typeset.pdf(template, DATA, DAY)
    found: list[bytes] = []

    def work() -> None:
        found.extend(typeset.pdf(template, DATA, DAY) for _ in range(5))

    threads = [threading.Thread(target=work) for _ in range(3)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert found == [expected] * 15
