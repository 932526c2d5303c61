"""The blocks that a report is made of, as the template reads them; text is made printable here."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable, Sequence
from typing import Any

from service.web.numbers import shown_down, shown_up
from service.web.runs import Run, runs
from service.web.typeset import unprintable

__all__ = [
    "Block",
    "Cell",
    "bullets",
    "cell",
    "down",
    "heading",
    "pairs",
    "paragraph",
    "printable",
    "reached",
    "table",
    "up",
    "verdict",
]

Block = dict[str, Any]
#: Text, or text in runs.
Cell = str | list[Run]


def printable(text: str) -> str:
    """A text with what the font lacks, and what would hide or turn text, written as code points."""
    composed = unicodedata.normalize("NFC", text)
    for character in unprintable(composed):
        composed = composed.replace(character, f"[U+{ord(character):04X}]")
    return composed


def cell(content: Cell) -> list[list[str]]:
    """Content as the template reads it: pieces of text, each with its place."""
    pieces = runs(content) if isinstance(content, str) else content
    return [[printable(run.text), run.place] for run in pieces]


def up(value: float, unit: str = "", digits: int = 3) -> str:
    """A figure rounded up, with its unit."""
    return f"{shown_up(value, digits)} {unit}".rstrip()


def down(value: float, unit: str = "", digits: int = 3) -> str:
    """A figure rounded down, with its unit."""
    return f"{shown_down(value, digits)} {unit}".rstrip()


def reached(distance_m: float | None) -> str:
    """A hazard distance: none, unbounded, or rounded up."""
    if distance_m is None:
        return "unbounded"
    return up(distance_m, "m") if distance_m else "none"


def heading(text: str, level: int = 1) -> Block:
    """A heading, 1 for a section."""
    return {"kind": "heading", "text": printable(text), "level": level}


def paragraph(content: Cell, small: bool = False) -> Block:
    """A paragraph."""
    return {"kind": "paragraph", "text": cell(content), "small": small}


def verdict(name: str, content: Cell, state: str) -> Block:
    """A sentence that counts; `state` is unsafe, open or within."""
    return {"kind": "verdict", "name": name, "text": cell(content), "state": state}


def bullets(items: Iterable[Cell], boxes: bool = False, small: bool = False) -> Block:
    """A list; with boxes to tick."""
    return {"kind": "list", "items": [cell(item) for item in items], "boxes": boxes, "small": small}


def pairs(rows: Iterable[tuple[str, Cell]]) -> Block:
    """Names and values."""
    return {"kind": "pairs", "rows": [[printable(name), cell(value)] for name, value in rows]}


def table(
    head: Sequence[str], rows: Iterable[Sequence[Cell]], widths: Sequence[float], marked: Iterable[int] = ()
) -> Block:
    """A table: relative widths of its columns, numbers of the rows that count most."""
    body = [[cell(content) for content in row] for row in rows]
    return {"kind": "table", "head": list(head), "rows": body, "widths": list(widths), "marked": list(marked)}
