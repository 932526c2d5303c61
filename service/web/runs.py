"""Text in runs: plain, lowered or raised, for media that know no HTML."""

from __future__ import annotations

import re
from html.parser import HTMLParser
from typing import NamedTuple

from markupsafe import Markup

__all__ = ["Run", "runs", "spoken"]

RAISED = re.compile(r"([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+)")
DIGITS = str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "−0123456789")
#: Characters that are raised by themselves and exist in every font: m², cm³.
SINGLE = {"²", "³", "¹"}


class Run(NamedTuple):
    """A piece of text; `place` is blank, `sub` or `sup`."""

    text: str
    place: str


class _Reader(HTMLParser):
    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.found: list[Run] = []
        self.place = ""

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        if tag in ("sub", "sup"):
            self.place = tag

    def handle_endtag(self, tag: str) -> None:
        if tag in ("sub", "sup"):
            self.place = ""

    def handle_data(self, data: str) -> None:
        self.found += [Run(data, "sup")] if self.place == "sup" else _plain(data, self.place)


def _plain(text: str, place: str) -> list[Run]:
    """Text with powers as typed (10⁻⁵) as runs."""
    found = []
    for part in RAISED.split(text):
        if not part:
            continue
        if RAISED.fullmatch(part) and part not in SINGLE:
            found.append(Run(part.translate(DIGITS), "sup"))
        else:
            found.append(Run(part, place))
    return found


def runs(text: str) -> list[Run]:
    """The runs of a text. Markup may hold <sub> and <sup>; any other text is taken as it is."""
    if not isinstance(text, Markup):
        return _plain(text, "")
    reader = _Reader()
    reader.feed(str(text))
    reader.close()
    return reader.found


def spoken(text: str) -> str:
    """A text for readers without sight of raised digits: 2 × 10^−5."""
    return "".join(f"^{run.text}" if run.place == "sup" else run.text for run in runs(text))
