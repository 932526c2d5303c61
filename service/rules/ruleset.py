"""One rule set as published: its rows, its sources and a digest of its files."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from service.rules.limit_set import LimitSet, limit_set_parts, take
from service.rules.tables import (
    ApertureRow,
    DurationRow,
    Source,
    TableError,
    read_rows,
    read_sources,
    read_toml,
)

__all__ = ["DEFAULT_RULES", "TARGETS", "RuleSet", "load_all", "load_ruleset"]

#: The rule set used where a request names none.
DEFAULT_RULES = "icnirp-2013"
#: What a limit protects.
TARGETS = ("eye", "skin")

TABLES = ("apertures.csv", "durations.csv", "factors.csv", "limits.csv", "repetition.csv")


@dataclass(frozen=True, slots=True, kw_only=True)
class RuleSet(LimitSet):
    """A published set of exposure limits, with limiting apertures and conventional durations."""

    family: str
    apertures: tuple[ApertureRow, ...]
    durations: tuple[DurationRow, ...]


def load_ruleset(folder: Path, additivity: Path, sources: dict[str, Source]) -> RuleSet:
    """Read one rule set. Raises TableError on anything unknown, missing or inconsistent."""
    path = folder / "ruleset.toml"
    head = read_toml(path)
    parts = limit_set_parts(folder, "ruleset.toml", TABLES, head, additivity, sources)
    rules = RuleSet(
        **parts,
        family=take(path, head, "family", str),
        apertures=read_rows(folder / "apertures.csv", ApertureRow, sources),
        durations=read_rows(folder / "durations.csv", DurationRow, sources),
    )
    if head:
        raise TableError(path, 1, f"unknown keys {sorted(head)}")
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
