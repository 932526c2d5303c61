"""Strict reading of the tables under ``data/``.

A table is refused, naming file and line, on an unknown or missing column, a value that does not
parse, a duplicate row, an unknown source or a row without one. Numbers stay as printed.
"""

from __future__ import annotations

import csv
import hashlib
import math
import re
import tomllib
from dataclasses import dataclass, fields
from pathlib import Path
from typing import Any, TypeVar, get_type_hints

__all__ = [
    "AdditivityRow",
    "ApertureRow",
    "Bound",
    "DurationRow",
    "FactorRow",
    "LimitRow",
    "RepetitionRow",
    "Row",
    "Source",
    "TableError",
    "digest_of",
    "read_rows",
    "read_sources",
    "read_toml",
]

#: A limit of a band: a number, or the name of a factor (``T1``, ``T2``, ``alpha_max``).
Bound = float | str

KNOWN = ("read", "memory")
NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?")
NAME = re.compile(r"[A-Za-z]\w*")


class TableError(ValueError):
    """A table cannot be used. The message names the file, the line and the remedy."""

    def __init__(self, path: Path, line: int, message: str) -> None:
        super().__init__(f"{path.parent.name}/{path.name}, line {line}: {message}")


@dataclass(frozen=True, slots=True)
class Source:
    """One document. `year` is a number or the words 'not noted'."""

    key: str
    short: str
    title: str
    edition: str
    year: int | str
    publisher: str


@dataclass(frozen=True, slots=True)
class Row:
    """What every row carries: its name, where it is printed and how it is known."""

    row: str
    source: str
    locator: str
    known: str
    note: str
    line: int


@dataclass(frozen=True, slots=True)
class LimitRow(Row):
    """One printed limit: coefficient x t^time_power x factors, at most cap.

    `target` is eye or skin, or a class. `quantity` H is radiant exposure [J/m2], E irradiance [W/m2],
    Q energy [J], P power [W]; for Q and P the coefficient is in J or W. Bands: wavelength [nm] and time
    [s] from <= x < to; angular subtense [mrad] from < alpha <= to. Blank = unbounded.
    """

    target: str
    tissue: str
    effect: str
    wavelength_from_nm: float
    wavelength_to_nm: float
    time_from_s: Bound
    time_to_s: Bound
    subtense_from_mrad: float | None
    subtense_to_mrad: float | None
    quantity: str
    coefficient: float
    time_power: float
    factors: str
    cap: float | None


@dataclass(frozen=True, slots=True)
class FactorRow(Row):
    """One piece of a factor of x: offset + coefficient x 10^(slope (x - origin) / per) x x^power."""

    factor: str
    unit: str
    variable: str
    from_: float
    to: float | None
    offset: float
    coefficient: float
    slope: float | None
    origin: float | None
    per: float | None
    power: float | None

    def expression(self, x: float | str) -> str:
        """The piece as an expression of x (a number or a symbol)."""
        at = x if isinstance(x, str) else f"{x:.6g}"
        if self.slope:
            slope = "" if self.slope == 1 else f"{self.slope:g} x "
            per = f" / {self.per:g}" if self.per else ""
            power = f"10^({slope}({at} - {self.origin or 0:g}){per})"
            text = power if self.coefficient == 1 else f"{self.coefficient:g} x {power}"
        else:
            text = f"{self.coefficient:g}"
        if self.offset:
            text = f"{self.offset:g} + {text}"
        return f"{text} x {at}^{self.power:g}" if self.power else text


@dataclass(frozen=True, slots=True)
class ApertureRow(Row):
    """One limiting aperture: coefficient_mm x t^time_power [mm]; tissue ``*`` = all not named."""

    target: str
    tissue: str
    wavelength_from_nm: float
    wavelength_to_nm: float
    time_from_s: float
    time_to_s: float
    coefficient_mm: float
    time_power: float


@dataclass(frozen=True, slots=True)
class DurationRow(Row):
    """A conventional exposure duration [s]: the default of a band, or a choice offered in words."""

    kind: str
    wavelength_from_nm: float
    wavelength_to_nm: float
    duration_s: float
    words: str


@dataclass(frozen=True, slots=True)
class RepetitionRow(Row):
    """One row of the repetitive-pulse factor: coefficient x N^count_power, at least floor, at most 1.

    `pulse` is short (up to the grouping time), long or any. All bands are from < x <= to.
    """

    target: str
    tissue: str
    effect: str
    pulse: str
    exposure_from_s: float | None
    exposure_to_s: float | None
    subtense_from_mrad: Bound | None
    subtense_to_mrad: Bound | None
    count_from: float | None
    count_to: float | None
    coefficient: float
    count_power: float
    floor: float | None


@dataclass(frozen=True, slots=True)
class AdditivityRow(Row):
    """Whether exposures in two wavelength bands [nm] add, for eye and skin (yes or no)."""

    band_from_nm: float
    band_to_nm: float
    with_from_nm: float
    with_to_nm: float
    eye: str
    skin: str


R = TypeVar("R", bound=Row)

CHOICES = {
    "known": KNOWN,
    "quantity": ("H", "E", "Q", "P"),
    "effect": ("thermal", "photochemical"),
    "pulse": ("short", "long", "any"),
    "kind": ("default", "choice"),
    "variable": ("wavelength_nm", "time_s", "subtense_mrad"),
    "eye": ("yes", "no"),
    "skin": ("yes", "no"),
}
MAY_BE_BLANK = ("note", "factors")


def _cell(text: str, kind: Any, name: str) -> Any:
    """One cell as its declared type. Raises ValueError saying what was expected."""
    if kind is str:
        if not text and name not in MAY_BE_BLANK:
            raise ValueError(f"{name} is empty")
        if name in CHOICES and text not in CHOICES[name]:
            raise ValueError(f"{name} is {text!r}, expected one of {', '.join(CHOICES[name])}")
        return text
    optional = type(None) in getattr(kind, "__args__", ())
    if not text:
        if optional:
            return None
        raise ValueError(f"{name} is empty, expected a number")
    if not NUMBER.fullmatch(text):
        if str in getattr(kind, "__args__", ()) and NAME.fullmatch(text):
            return text
        raise ValueError(f"{name} is {text!r}, expected a number")
    value = float(text)
    if not math.isfinite(value):
        raise ValueError(f"{name} is {text!r}, expected a finite number")
    return value


def read_rows(path: Path, kind: type[R], sources: dict[str, Source]) -> tuple[R, ...]:
    """All rows of one CSV table as `kind`, in file order.

    Raises
    ------
    TableError
        unknown, missing or repeated column; a cell that does not parse; a repeated row name; an
        unknown source.
    """
    hints = get_type_hints(kind)
    columns = {f.name.rstrip("_"): f.name for f in fields(kind) if f.name != "line"}
    rows: list[R] = []
    seen: set[str] = set()
    with path.open(encoding="utf-8", newline="") as handle:
        reader = csv.reader(handle, strict=True)
        header = next(reader, [])
        unknown = [c for c in header if c not in columns]
        missing = [c for c in columns if c not in header]
        if unknown or missing or len(set(header)) != len(header):
            raise TableError(path, 1, f"columns unknown: {unknown}, missing: {missing}, or repeated")
        for cells in reader:
            line = reader.line_num
            if len(cells) != len(header):
                raise TableError(path, line, f"{len(cells)} cells, expected {len(header)}")
            values: dict[str, Any] = {"line": line}
            for name, text in zip(header, cells, strict=True):
                try:
                    values[columns[name]] = _cell(text.strip(), hints[columns[name]], name)
                except ValueError as error:
                    raise TableError(path, line, str(error)) from None
            row = kind(**values)
            if row.row in seen:
                raise TableError(path, line, f"row {row.row!r} stands twice")
            if row.source not in sources:
                raise TableError(path, line, f"source {row.source!r} is not in sources.toml")
            seen.add(row.row)
            rows.append(row)
    if not rows:
        raise TableError(path, 1, "the table is empty")
    return tuple(rows)


def read_toml(path: Path) -> dict[str, Any]:
    """A TOML file as a dict. Raises TableError where it does not parse."""
    try:
        return tomllib.loads(path.read_text(encoding="utf-8"))
    except tomllib.TOMLDecodeError as error:
        raise TableError(path, 1, str(error)) from None


def read_sources(path: Path) -> dict[str, Source]:
    """The documents of ``sources.toml`` by key. Raises TableError on an unknown or missing entry."""
    wanted = {f.name for f in fields(Source)} - {"key"}
    sources = {}
    for key, entry in read_toml(path).items():
        if set(entry) != wanted:
            raise TableError(path, 1, f"[{key}] has {sorted(entry)}, expected {sorted(wanted)}")
        sources[key] = Source(key=key, **entry)
    return sources


def digest_of(paths: list[Path]) -> str:
    """sha256 over name and content of each file; line ends are normalised."""
    total = hashlib.sha256()
    for path in paths:
        total.update(path.name.encode() + b"\0")
        total.update(path.read_bytes().replace(b"\r\n", b"\n") + b"\0")
    return f"sha256:{total.hexdigest()}"
