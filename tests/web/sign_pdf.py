"""Reading a sign back from its PDF: words, letter boxes, drawn shapes."""

from __future__ import annotations

import io
import re
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import pdfplumber

__all__ = ["MM", "Read", "assert_set_well", "read"]

#: Points in a millimetre.
MM = 72.0 / 25.4
#: Height of capitals of the font per letter size: 660 of 1000 units in its OS/2 table.
CAPITAL = 0.66


@dataclass
class Read:
    """What a PDF holds: its pages, letters, and all text with plain blanks on one line."""

    pages: int
    size: tuple[float, float]
    letters: list[dict[str, Any]]
    text: str
    metadata: dict[str, Any]


def read(document: bytes) -> Read:
    with pdfplumber.open(io.BytesIO(document)) as opened:
        page = opened.pages[0]
        letters = [c for c in page.chars if c["text"].strip("\u00a0 ")]
        text = re.sub(r"\s+", " ", "".join(c["text"] for c in page.chars).replace("\u00a0", " "))
        size = (float(page.width), float(page.height))
        return Read(len(opened.pages), size, letters, text, opened.metadata)


def assert_set_well(
    found: Read, corner: tuple[float, float], sign: tuple[float, float], least_mm: float
) -> None:
    """One page; every letter inside the sign's edge, large enough, and on no other letter. Lengths in mm."""
    assert found.pages == 1
    left, top = (c * MM for c in corner)
    right, bottom = left + sign[0] * MM, top + sign[1] * MM
    rows: dict[float, list[dict[str, Any]]] = {}
    for letter in found.letters:
        size = letter["size"]
        assert size * CAPITAL >= least_mm * MM - 0.01, letter
        # The box of a letter is taller than its ink; from capitals' top to a fifth below the line counts.
        line = letter["bottom"] - 0.27 * size
        assert left < letter["x0"], letter
        assert letter["x1"] < right, letter
        assert top < line - CAPITAL * size, letter
        assert line + 0.2 * size < bottom, letter
        rows.setdefault(round(line, 1), []).append(letter)
    for letters in rows.values():
        ordered = sorted(letters, key=lambda c: c["x0"])
        for one, other in pairwise(ordered):
            assert one["x1"] <= other["x0"] + 0.12 * one["size"], (one["text"], other["text"])
    _lines_apart(rows)


def _lines_apart(rows: dict[float, list[dict[str, Any]]]) -> None:
    """Ink of lines that stand above each other does not touch: capitals' top below the line before."""
    spans = [
        (line, min(c["x0"] for c in cs), max(c["x1"] for c in cs), max(c["size"] for c in cs))
        for line, cs in sorted(rows.items())
    ]
    for k, (line, left, right, _) in enumerate(spans):
        for below, other_left, other_right, size in spans[k + 1 :]:
            if other_left < right and left < other_right and not _columns_apart(rows, line, below):
                assert below - CAPITAL * size >= line - 0.01, (line, below)


def _columns_apart(rows: dict[float, list[dict[str, Any]]], one: float, other: float) -> bool:
    """Whether no letter of one line stands above a letter of the other."""
    return not any(a["x0"] < b["x1"] and b["x0"] < a["x1"] for a in rows[one] for b in rows[other])
