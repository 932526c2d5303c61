"""A page as a tree of elements, and figures as they are shown: standard library only."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from decimal import Decimal
from html.parser import HTMLParser

__all__ = ["Element", "one_unit", "parse", "shown_value"]

VOID = {"area", "base", "br", "col", "embed", "hr", "img", "input", "link", "meta", "source", "track", "wbr"}


@dataclass
class Element:
    """One element; its content is text and elements in order."""

    tag: str
    attributes: dict[str, str]
    content: list[Element | str] = field(default_factory=list)

    def walk(self) -> Iterator[Element]:
        yield self
        for part in self.content:
            if isinstance(part, Element):
                yield from part.walk()

    def all(self, tag: str, **attributes: str) -> list[Element]:
        """Elements of this tag with these attributes, in order; class_ for class."""
        wanted = {name.rstrip("_").replace("_", "-"): value for name, value in attributes.items()}
        return [e for e in self.walk() if e.tag == tag and wanted.items() <= e.attributes.items()]

    def one(self, tag: str, **attributes: str) -> Element:
        (found,) = self.all(tag, **attributes)
        return found

    def by_id(self, name: str) -> Element:
        (found,) = (e for e in self.walk() if e.attributes.get("id") == name)
        return found

    @property
    def ids(self) -> list[str]:
        return [e.attributes["id"] for e in self.walk() if "id" in e.attributes]

    @property
    def text(self) -> str:
        parts = (p if isinstance(p, str) else p.text for p in self.content)
        return re.sub(r"\s+", " ", "".join(parts)).strip()


class _Reader(HTMLParser):
    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.root = Element("page", {})
        self.open = [self.root]

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        names = [name for name, _ in attrs]
        assert len(set(names)) == len(names), f"an attribute stands twice in <{tag}>"
        element = Element(tag, {name: value or "" for name, value in attrs})
        self.open[-1].content.append(element)
        if tag not in VOID:
            self.open.append(element)

    def handle_endtag(self, tag: str) -> None:
        assert self.open[-1].tag == tag, f"</{tag}> closes <{self.open[-1].tag}>"
        self.open.pop()

    def handle_data(self, data: str) -> None:
        self.open[-1].content.append(data)


def parse(text: str) -> Element:
    """The tree of a page; every element must be closed in order."""
    reader = _Reader()
    reader.feed(text)
    reader.close()
    assert reader.open == [reader.root], f"<{reader.open[-1].tag}> is not closed"
    return reader.root


SUPERSCRIPT = str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "-0123456789")


def shown_value(text: str) -> Decimal:
    """A figure as shown, 1.23 × 10⁻⁵ or 0.0123, exactly."""
    match = re.fullmatch(r"(-?\d+(?:\.\d+)?)(?: × 10([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+))?", text)
    assert match, f"{text!r} is no figure"
    return Decimal(match[1]).scaleb(int((match[2] or "0").translate(SUPERSCRIPT)))


def one_unit(value: Decimal, digits: int = 3) -> Decimal:
    """One unit in the last of the significant digits of a value."""
    return Decimal(1).scaleb(value.adjusted() - digits + 1)
