"""Pairs of eyewear on the form: typed in one line of text, or picked from the demo shelf."""

from __future__ import annotations

import re
from functools import cache
from typing import Any

from service.files import DATA
from service.rules.tables import read_toml
from service.web.numbers import NotANumber, parse_number

__all__ = ["BadRanges", "parse_ranges", "shelf"]

RANGE = re.compile(r"([^:]*?)(?:\s*[-–]\s*([^:]*?))?\s*:\s*(.*)", re.DOTALL)
DENSITY = re.compile(r"OD\s*(\S+)", re.IGNORECASE)


class BadRanges(ValueError):
    """Ranges that cannot be read; the message says why."""


@cache
def shelf() -> dict[str, dict[str, Any]]:
    """The demo shelf: pairs as the request takes them, by id."""
    pairs = read_toml(DATA / "demo" / "eyewear.toml")["pair"]
    return {p["id"]: {k: v for k, v in p.items() if k != "id"} for p in pairs}


def parse_ranges(text: str) -> list[dict[str, Any]]:
    """Ranges such as ``780-1100: OD 7 | D LB6 + IR LB7; 532: OD 5`` as the request takes them.

    Ranges are parted by semicolons; after the colon an optical density, a marking, or both with a
    bar between. Raises BadRanges.
    """
    found = []
    for part in (p.strip() for p in text.split(";") if p.strip()):
        match = RANGE.fullmatch(part)
        if match is None or not match[1].strip():
            raise BadRanges(f"{part[:60]!r} is no range: write 780-1100: OD 7 | D LB6 + IR LB7")
        low = _number(match[1])
        entry: dict[str, Any] = {"from_nm": low, "to_nm": low if match[2] is None else _number(match[2])}
        for item in (i.strip() for i in match[3].split("|") if i.strip()):
            density = DENSITY.fullmatch(item)
            name, value = ("optical_density", _number(density[1])) if density else ("marking", item)
            if name in entry:
                raise BadRanges(f"{part[:60]!r} names two values of one kind; start a new range")
            entry[name] = value
        if len(entry) == 2:
            raise BadRanges(f"{part[:60]!r} names neither an optical density (OD 7) nor a marking (D LB6)")
        found.append(entry)
    if not found:
        raise BadRanges("there is no range; write 780-1100: OD 7 | D LB6 + IR LB7")
    return found


def _number(text: str) -> float:
    try:
        return parse_number(text)
    except NotANumber as error:
        raise BadRanges(f"{text.strip()[:40]!r}: {error}") from None
