"""Typesetting: a template and data become PDF, SVG or PNG, the same bytes for the same input.

A template is a typst file under ``templates/``. It reads its data with ``json(bytes(sys.inputs.data))``: text
of users reaches it as strings of a JSON document and is never read as markup or code. A template that cannot
place something calls ``panic("refused: " + reason)``.
"""

from __future__ import annotations

import json
import struct
import threading
import unicodedata
from collections.abc import Iterator
from datetime import UTC, date, datetime
from functools import cache
from pathlib import Path
from typing import Any, Literal

import font_source_sans_pro  # type: ignore[import-untyped]
import typst

from service.files import TEMPLATES

__all__ = ["MEDIA", "PageFormat", "TypesetError", "Unprintable", "pages", "pdf", "unprintable"]

PageFormat = Literal["svg", "png"]
MEDIA = {"pdf": "application/pdf", "svg": "image/svg+xml", "png": "image/png"}
FONTS = Path(font_source_sans_pro.__file__).parent / "files"
#: Faces that templates use: a character must be in each. The italic lacks Greek, so templates stand upright.
FACES = ("Regular", "Semibold", "Bold")
REFUSED = "panicked with: refused: "
_own = threading.local()


class TypesetError(ValueError):
    """The template refused its data; the message is the reason it gave."""


class Unprintable(ValueError):
    """A text holds characters that cannot be printed: `path` of the text in the data, `characters`."""

    def __init__(self, path: str, characters: list[str]) -> None:
        super().__init__(f"{path}: {', '.join(f'U+{ord(c):04X}' for c in characters)} cannot be printed")
        self.path = path
        self.characters = characters


def pdf(template: str, data: dict[str, Any], dated: date) -> bytes:
    """A tagged PDF (PDF/UA-1) with its fonts embedded. Call it off the event loop: it takes milliseconds.

    Parameters
    ----------
    template : path of a typst file below ``templates/``, such as ``report/report.typ``
    data : what the template reads; anything that JSON holds
    dated : the date in the PDF's properties; the clock is never asked

    Raises
    ------
    Unprintable : a text of `data` holds a character that the font lacks or that hides or turns text
    TypesetError : the template refused
    """
    (document,) = _compile(template, data, dated, "pdf", None)
    return document


def pages(
    template: str, data: dict[str, Any], dated: date, form: PageFormat, dots_per_inch: float = 144.0
) -> list[bytes]:
    """The pages as pictures, in order; `dots_per_inch` counts for PNG alone. Otherwise as `pdf`."""
    return _compile(template, data, dated, form, dots_per_inch)


def unprintable(text: str) -> list[str]:
    """Characters of a text that cannot be printed, each once: not in the font, or control and format."""
    glyphs = _glyphs()
    return [c for c in dict.fromkeys(text) if not (c == "\n" or (ord(c) in glyphs and _visible(c)))]


def _visible(character: str) -> bool:
    """Neither control, format (which may turn or hide text), surrogate, private, nor a line separator."""
    category = unicodedata.category(character)
    return category[0] != "C" and category not in ("Zl", "Zp")


def _compiler() -> typst.Compiler:
    """The compiler of this thread: one must not be used by two at a time."""
    if not hasattr(_own, "compiler"):
        _own.compiler = typst.Compiler(root=str(TEMPLATES), font_paths=[str(FONTS)], ignore_system_fonts=True)
    compiler: typst.Compiler = _own.compiler
    return compiler


def _compile(
    template: str,
    data: dict[str, Any],
    dated: date,
    form: Literal["pdf", "svg", "png"],
    dots_per_inch: float | None,
) -> list[bytes]:
    for path, text in _texts(data, ""):
        found = unprintable(text)
        if found:
            raise Unprintable(path, found)
    options: dict[str, Any] = {"pdf_standards": ["ua-1"]} if form == "pdf" else {}
    midnight = datetime(dated.year, dated.month, dated.day, tzinfo=UTC)
    try:
        made = _compiler().compile(
            input=str(TEMPLATES / template),
            format=form,
            ppi=dots_per_inch,
            sys_inputs={"data": json.dumps(data, allow_nan=False)},
            timestamp=int(midnight.timestamp()),
            **options,
        )
    except typst.TypstError as error:
        if error.message.startswith(REFUSED):
            raise TypesetError(error.message.removeprefix(REFUSED)) from None
        raise
    assert made is not None
    return made if isinstance(made, list) else [made]


def _texts(value: Any, path: str) -> Iterator[tuple[str, str]]:
    """Every text in the data with its path."""
    if isinstance(value, str):
        yield path, value
    elif isinstance(value, dict):
        for name, inner in value.items():
            yield from _texts(inner, f"{path}.{name}" if path else str(name))
    elif isinstance(value, list | tuple):
        for k, inner in enumerate(value):
            yield from _texts(inner, f"{path}.{k}")


@cache
def _glyphs() -> frozenset[int]:
    """Code points that every face of the font has a glyph for."""
    faces = [_characters((FONTS / f"SourceSansPro-{face}.otf").read_bytes()) for face in FACES]
    return frozenset.intersection(*faces)


def _characters(font: bytes) -> frozenset[int]:
    """Code points of a font's character map (OpenType `cmap`, format 4: the basic plane)."""
    (count,) = struct.unpack_from(">H", font, 4)
    records = (struct.unpack_from(">4sLLL", font, 12 + 16 * k) for k in range(count))
    start = next(offset for tag, _, offset, _ in records if tag == b"cmap")
    (tables,) = struct.unpack_from(">H", font, start + 2)
    offsets = (start + struct.unpack_from(">HHL", font, start + 4 + 8 * k)[2] for k in range(tables))
    table = next(offset for offset in offsets if struct.unpack_from(">H", font, offset) == (4,))
    segments = struct.unpack_from(">H", font, table + 6)[0] // 2

    def column(k: int) -> tuple[int, ...]:
        """Column k of the segments; one word of padding stands after the first."""
        return struct.unpack_from(f">{segments}H", font, table + 14 + 2 * segments * k + (2 if k else 0))

    found = set()
    rows = zip(column(1), column(0), column(2), column(3), range(segments), strict=True)
    for first, last, delta, indirect, k in rows:
        for code in range(first, last + 1):
            glyph = code
            if indirect:
                place = table + 16 + 6 * segments + 2 * k + indirect + 2 * (code - first)
                (glyph,) = struct.unpack_from(">H", font, place)
            if glyph and (glyph + delta) & 0xFFFF:
                found.add(code)
    return frozenset(found)
