"""One rule set as published: its rows, its sources and a digest of its files."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from service.rules.tables import (
    KNOWN,
    AdditivityRow,
    ApertureRow,
    DurationRow,
    FactorRow,
    LimitRow,
    RepetitionRow,
    Source,
    TableError,
    read_rows,
    read_sources,
    read_toml,
)

__all__ = [
    "DEFAULT_RULES",
    "TARGETS",
    "Coverage",
    "LimitSet",
    "RuleSet",
    "StepRule",
    "load_all",
    "load_ruleset",
]

#: The rule set used where a request names none.
DEFAULT_RULES = "icnirp-2013"
#: What a limit protects.
TARGETS = ("eye", "skin")

SHARED = ("known", "locator", "source", "time_s", "wavelength_nm")
ROLES = ("alpha_max", "alpha_min", "field_angle", "grouping", "long_break")
HEAD = ("document", "family", "id", "standing", "standing_text", "title")
TABLES = ("apertures.csv", "durations.csv", "factors.csv", "limits.csv", "repetition.csv")


@dataclass(frozen=True, slots=True)
class Coverage:
    """A rectangle of wavelength [nm] and time [s] that the limit rows must fill without a gap."""

    target: str
    tissue: str | None
    effect: str | None
    wavelength_nm: tuple[float, float]
    time_s: tuple[float, float]


@dataclass(frozen=True, slots=True)
class StepRule:
    """A factor that compares the source's subtense with an angle: its symbol, texts and source."""

    symbol: str
    below: str
    between: str
    beyond: str
    source: str
    locator: str
    known: str
    note: str


@dataclass(frozen=True, slots=True, kw_only=True)
class LimitSet:
    """A published set of limits: rows, factors and how they fit together.

    `digest` is sha256 over its files, in name order.
    """

    id: str
    title: str
    document: str
    standing: str
    standing_text: str
    digest: str
    path: Path
    sources: dict[str, Source]
    limits: tuple[LimitRow, ...]
    factors: tuple[FactorRow, ...]
    repetition: tuple[RepetitionRow, ...]
    additivity: tuple[AdditivityRow, ...]
    roles: dict[str, str]
    subtense: StepRule
    field: StepRule
    repetition_symbol: str
    count_within: str
    shared_wavelengths_nm: tuple[float, ...]
    shared_times_s: tuple[float, ...]
    coverage: tuple[Coverage, ...]

    def source_text(self, key: str, locator: str) -> str:
        """Document and place as one line of text."""
        return f"{self.sources[key].short}, {locator}"


@dataclass(frozen=True, slots=True, kw_only=True)
class RuleSet(LimitSet):
    """A published set of exposure limits, with limiting apertures and conventional durations."""

    family: str
    apertures: tuple[ApertureRow, ...]
    durations: tuple[DurationRow, ...]


def _digest(paths: list[Path]) -> str:
    """sha256 over name and content of each file; line ends are normalised."""
    total = hashlib.sha256()
    for path in paths:
        total.update(path.name.encode() + b"\0")
        total.update(path.read_bytes().replace(b"\r\n", b"\n") + b"\0")
    return f"sha256:{total.hexdigest()}"


def _step(path: Path, entry: dict[str, Any]) -> StepRule:
    try:
        step = StepRule(**{"between": "", **entry})
    except TypeError as error:
        raise TableError(path, 1, f"subtense or field: {error}") from None
    if step.known not in KNOWN:
        raise TableError(path, 1, f"known is {step.known!r}, expected one of {', '.join(KNOWN)}")
    return step


def _keys(path: Path, name: str, table: dict[str, Any], wanted: tuple[str, ...]) -> None:
    if sorted(table) != sorted(wanted):
        raise TableError(path, 1, f"{name} has the keys {sorted(table)}, expected {sorted(wanted)}")


def _coverage(path: Path, entry: dict[str, Any]) -> Coverage:
    cover = {"tissue": None, "effect": None, **entry}
    _keys(path, "coverage", cover, ("effect", "target", "time_s", "tissue", "wavelength_nm"))
    (w0, w1), (t0, t1) = cover["wavelength_nm"], cover["time_s"]
    bands = (float(w0), float(w1)), (float(t0), float(t1))
    return Coverage(cover["target"], cover["tissue"], cover["effect"], *bands)


def _take(path: Path, table: dict[str, Any], key: str, kind: type) -> Any:
    if not isinstance(table.get(key), kind):
        raise TableError(path, 1, f"{key} is missing or not a {kind.__name__}")
    return table.pop(key)


def load_ruleset(folder: Path, additivity: Path, sources: dict[str, Source]) -> RuleSet:
    """Read one rule set. Raises TableError on anything unknown, missing or inconsistent."""
    path = folder / "ruleset.toml"
    head = read_toml(path)
    texts = {key: _take(path, head, key, str) for key in HEAD}
    roles = _take(path, head, "roles", dict)
    repetition = _take(path, head, "repetition", dict)
    subtense = _step(path, _take(path, head, "subtense", dict))
    field = _step(path, _take(path, head, "field", dict))
    coverage = tuple(_coverage(path, entry) for entry in _take(path, head, "coverage", list))
    shared = head.pop("shared_boundaries", dict.fromkeys(SHARED, ()))
    _keys(path, "shared_boundaries", shared, SHARED)
    if head:
        raise TableError(path, 1, f"unknown keys {sorted(head)}")
    if texts["id"] != folder.name:
        raise TableError(path, 1, f"id {texts['id']!r} differs from the folder's name")
    if sorted(roles) != sorted(ROLES):
        raise TableError(path, 1, f"roles are {sorted(roles)}, expected {sorted(ROLES)}")
    _keys(path, "repetition", repetition, ("count_within", "symbol"))
    if repetition["count_within"] not in ("T2", "exposure"):
        raise TableError(path, 1, "repetition.count_within is neither T2 nor exposure")
    for key in (texts["document"], subtense.source, field.source):
        if key not in sources:
            raise TableError(path, 1, f"source {key!r} is not in sources.toml")
    rules = RuleSet(
        **texts,
        digest=_digest([folder / name for name in TABLES] + [path, additivity]),
        limits=read_rows(folder / "limits.csv", LimitRow, sources),
        factors=read_rows(folder / "factors.csv", FactorRow, sources),
        apertures=read_rows(folder / "apertures.csv", ApertureRow, sources),
        durations=read_rows(folder / "durations.csv", DurationRow, sources),
        repetition=read_rows(folder / "repetition.csv", RepetitionRow, sources),
        additivity=read_rows(additivity, AdditivityRow, sources),
        sources=sources,
        roles=roles,
        subtense=subtense,
        field=field,
        repetition_symbol=repetition["symbol"],
        count_within=repetition["count_within"],
        shared_wavelengths_nm=tuple(map(float, shared["wavelength_nm"])),
        shared_times_s=tuple(map(float, shared["time_s"])),
        coverage=coverage,
        path=folder,
    )
    for name, rows in (("limits.csv", rules.limits), ("apertures.csv", rules.apertures)):
        for row in rows:
            if row.target not in TARGETS:
                raise TableError(folder / name, row.line, f"target is {row.target!r}, not eye or skin")
    for limit in rules.limits:
        if limit.quantity not in "HE":
            raise TableError(folder / "limits.csv", limit.line, f"quantity is {limit.quantity!r}, not H or E")
    return rules


def load_all(data: Path) -> dict[str, RuleSet]:
    """Every rule set under ``data/rules``, the default first, then by id. Raises TableError."""
    sources = read_sources(data / "sources.toml")
    folders = sorted(p.parent for p in (data / "rules").glob("*/ruleset.toml"))
    folders.sort(key=lambda p: p.name != DEFAULT_RULES)
    additivity = data / "rules" / "additivity.csv"
    return {p.name: load_ruleset(p, additivity, sources) for p in folders}
