"""The tables of signs: symbol, signal words, sheets and phrases, read strictly."""

from __future__ import annotations

from functools import cache
from pathlib import Path
from typing import Any, Literal, TypeVar

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from service.files import DATA
from service.rules.tables import TableError, read_sources, read_toml

__all__ = [
    "ClassWords",
    "Layout",
    "Phrases",
    "SignTables",
    "Signal",
    "Symbol",
    "load_tables",
    "sign_tables",
]


class Entry(BaseModel):
    """A table: every key is known, none is missing."""

    model_config = ConfigDict(extra="forbid", frozen=True)


E = TypeVar("E", bound=Entry)


class Cited(Entry):
    """An entry with its document."""

    source: str
    locator: str
    known: Literal["read", "memory"]
    note: str = ""


class Triangle(Cited):
    """Yellow edge, black band and corner radius as shares of the side."""

    margin: float
    band: float
    radius: float


class Burst(Cited):
    """The burst of rays: diameters and stroke as shares of the side."""

    long: float
    short: float
    disc: float
    stroke: float
    rays: int
    beam: float


class ViewingRule(Cited):
    """How far a symbol can be recognised: h = L / height_factor, A = L^2 / area_factor [m, m2]."""

    height_factor: float
    area_factor: float
    yellow_share: float


class Letters(Cited):
    """How far capitals can be read, as a multiple of their height."""

    distance_factor: float


class Colours(Cited):
    """Colours of the symbol as sRGB."""

    yellow: str
    black: str


class Symbol(Entry):
    """``symbol.toml``."""

    triangle: Triangle
    burst: Burst
    viewing: ViewingRule
    letters: Letters
    colours: Colours


class Signal(Entry):
    """A signal word's colours, and whether the alert symbol stands before it."""

    background: str
    text: str
    alert: bool


class Order(Cited):
    """Signal words, the strongest first."""

    words: list[str]


class ClassWords(Entry):
    """What a class takes: phrases, signal word, symbol."""

    scheme: str
    name: str
    level: str
    word: str
    symbol: bool
    controlled: bool


class Policy(Cited):
    """Levels that a site always gives DANGER."""

    danger: list[str]


class Words(Entry):
    """``words.toml``."""

    signal: dict[str, Signal]
    order: Order
    classes: list[ClassWords] = Field(alias="class")
    visible: dict[str, tuple[float, float]]
    policy: dict[str, Policy]


class Labels(Entry):
    """Label sizes [mm], and the limits of any size that is asked for."""

    sizes: list[tuple[float, float]]
    least: tuple[float, float]
    most: tuple[float, float]


class Layout(Entry):
    """Free edge, gaps and letter heights; shares are of the square root of a sign's area."""

    margin_share: float
    margin_least_mm: float
    label_margin_share: float
    cut_gap_mm: float
    headline_least_share: float
    headline_most_share: float
    detail_least_mm: float
    detail_most_share: float
    detail_good_share: float
    fine_least_mm: float
    fine_share: float
    label_least_mm: float
    qr_module_least_mm: float
    note: str


class Sheets(Entry):
    """``sheets.toml``."""

    sheet: dict[str, tuple[float, float]]
    labels: Labels
    layout: Layout


class Phrases(Entry):
    """``phrases/<lang>.toml``: the words of one language."""

    name: str
    decimal: Literal[".", ","]
    check: str
    signal: dict[str, str]
    radiation: dict[str, str]
    sentence: dict[str, str]
    words: dict[str, str]


class SignTables(Entry):
    """Everything that signs are made from."""

    symbol: Symbol
    words: Words
    sheets: Sheets
    phrases: dict[str, Phrases]

    def class_words(self, scheme: str, name: str) -> ClassWords:
        """What a class takes. Raises KeyError where the table lacks it."""
        for entry in self.words.classes:
            if (entry.scheme, entry.name) == (scheme, name):
                return entry
        raise KeyError((scheme, name))


def load_tables(data: Path) -> SignTables:
    """The tables below a data folder. Raises TableError naming the file and what is wrong with it."""
    folder = data / "signs"
    sources = read_sources(data / "sources.toml")
    languages = sorted((folder / "phrases").glob("*.toml"), key=lambda p: (p.stem != "en", p.stem))
    symbol = _read(folder / "symbol.toml", Symbol, sources)
    words = _read(folder / "words.toml", Words, sources)
    sheets = _read(folder / "sheets.toml", Sheets, sources)
    phrases = {p.stem: _read(p, Phrases, sources) for p in languages}
    for path in languages:
        _same_phrases(path, phrases["en"], phrases[path.stem])
    tables = SignTables.model_construct(symbol=symbol, words=words, sheets=sheets, phrases=phrases)
    _agreeing(folder, tables)
    return tables


@cache
def sign_tables() -> SignTables:
    """The tables of this service."""
    return load_tables(DATA)


def _read(path: Path, kind: type[E], sources: dict[str, Any]) -> E:
    try:
        entry = kind.model_validate(read_toml(path))
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        place = ".".join(str(p) for p in first["loc"])
        raise TableError(path, 1, f"{place}: {first['msg']}") from None
    for name, found in _cited(entry):
        if found.source not in sources:
            raise TableError(path, 1, f"{name}: source {found.source!r} is not in sources.toml")
    return entry


def _cited(entry: Entry) -> list[tuple[str, Cited]]:
    found = []
    for name in type(entry).model_fields:
        value = getattr(entry, name)
        inner = value.values() if isinstance(value, dict) else [value]
        found += [(name, v) for v in inner if isinstance(v, Cited)]
    return found


def _same_phrases(path: Path, first: Phrases, other: Phrases) -> None:
    """Every language says the same things, with the same gaps to fill."""
    for part in ("signal", "radiation", "sentence", "words"):
        wanted, found = getattr(first, part), getattr(other, part)
        if set(wanted) != set(found):
            raise TableError(path, 1, f"[{part}] differs in {sorted(set(wanted) ^ set(found))}")
        for key, text in found.items():
            if not text.strip() or text.count("{}") != wanted[key].count("{}"):
                raise TableError(path, 1, f"[{part}] {key} is blank or has other gaps than in en")


def _agreeing(folder: Path, tables: SignTables) -> None:
    """Words, signals and levels name each other."""
    path, words = folder / "words.toml", tables.words
    if set(words.order.words) != set(words.signal) or set(words.signal) != set(tables.phrases["en"].signal):
        raise TableError(path, 1, "order, signals and phrases name different signal words")
    levels = {c.level for c in words.classes}
    if levels - {"1"} != set(tables.phrases["en"].sentence):
        raise TableError(path, 1, "classes and phrases name different levels")
    unknown = {c.word for c in words.classes} - set(words.signal)
    unknown |= {level for p in words.policy.values() for level in p.danger} - levels
    unknown |= {c.scheme for c in words.classes} - set(words.visible)
    if unknown:
        raise TableError(path, 1, f"{sorted(unknown)} is used and not defined")
