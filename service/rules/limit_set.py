"""A published set of limits: what exposure limits and emission limits have in common."""

from __future__ import annotations

import math
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from service.rules.tables import (
    KNOWN,
    AdditivityRow,
    FactorRow,
    LimitRow,
    RepetitionRow,
    Source,
    TableError,
    digest_of,
    read_rows,
)

__all__ = [
    "Coverage",
    "Growth",
    "LimitSet",
    "StepRule",
    "check_keys",
    "limit_set_parts",
    "numbers_ascend",
    "take",
]

ROLES = ("alpha_max", "alpha_min", "field_angle", "grouping", "long_break")
HEAD = ("document", "id", "standing", "standing_text", "title")
SHARED = ("known", "locator", "source", "time_s", "wavelength_nm")


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


@dataclass(frozen=True, slots=True)
class Growth:
    """A factor of wavelength and time: max(1, min(t, until_s) x rate), rate by wavelength band.

    `bands` holds (from [nm], to [nm], origin [nm], per [nm s]): rate = (wavelength - origin) / per, or
    1 / per where the origin is None. 1 outside the bands.
    """

    symbol: str
    until_s: float
    bands: tuple[tuple[float, float, float | None, float], ...]
    source: str
    locator: str
    known: str


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
    growth: Growth | None = None

    def source_text(self, key: str, locator: str) -> str:
        """Document and place as one line of text."""
        return f"{self.sources[key].short}, {locator}"


def _step(path: Path, entry: dict[str, Any]) -> StepRule:
    try:
        step = StepRule(**{"between": "", **entry})
    except TypeError as error:
        raise TableError(path, 1, f"subtense or field: {error}") from None
    if step.known not in KNOWN:
        raise TableError(path, 1, f"known is {step.known!r}, expected one of {', '.join(KNOWN)}")
    return step


def check_keys(path: Path, name: str, table: dict[str, Any], wanted: tuple[str, ...]) -> None:
    """Raise TableError unless a table has just the keys wanted."""
    if sorted(table) != sorted(wanted):
        raise TableError(path, 1, f"{name} has the keys {sorted(table)}, expected {sorted(wanted)}")


def numbers_ascend(path: Path, name: str, pair: Any) -> tuple[float, float]:
    """A pair of ascending finite numbers. Raises TableError on anything else."""
    numbers = isinstance(pair, list) and all(isinstance(x, int | float) for x in pair)
    if not numbers or len(pair) != 2 or any(isinstance(x, bool) or not math.isfinite(x) for x in pair):
        raise TableError(path, 1, f"{name} is {pair!r}, expected two finite numbers")
    if pair[0] >= pair[1]:
        raise TableError(path, 1, f"{name} is {pair!r}, expected ascending numbers")
    return float(pair[0]), float(pair[1])


def _coverage(path: Path, entry: dict[str, Any]) -> Coverage:
    cover = {"tissue": None, "effect": None, **entry}
    check_keys(path, "coverage", cover, ("effect", "target", "time_s", "tissue", "wavelength_nm"))
    bands = [numbers_ascend(path, f"coverage.{key}", cover[key]) for key in ("wavelength_nm", "time_s")]
    return Coverage(cover["target"], cover["tissue"], cover["effect"], *bands)


def take(path: Path, table: dict[str, Any], key: str, kind: type) -> Any:
    """Take a key out of a table. Raises TableError where it is missing or of another kind."""
    if not isinstance(table.get(key), kind):
        raise TableError(path, 1, f"{key} is missing or not a {kind.__name__}")
    return table.pop(key)


def limit_set_parts(
    folder: Path,
    head_name: str,
    tables: tuple[str, ...],
    head: dict[str, Any],
    additivity: Path,
    sources: dict[str, Source],
) -> dict[str, Any]:
    """The fields of a LimitSet, read from a folder; their keys are taken out of `head`.

    Raises TableError on anything unknown, missing or inconsistent.
    """
    path = folder / head_name
    texts = {key: take(path, head, key, str) for key in HEAD}
    roles = take(path, head, "roles", dict)
    repetition = take(path, head, "repetition", dict)
    subtense = _step(path, take(path, head, "subtense", dict))
    field = _step(path, take(path, head, "field", dict))
    coverage = tuple(_coverage(path, entry) for entry in take(path, head, "coverage", list))
    shared = head.pop("shared_boundaries", dict.fromkeys(SHARED, ()))
    check_keys(path, "shared_boundaries", shared, SHARED)
    if texts["id"] != folder.name:
        raise TableError(path, 1, f"id {texts['id']!r} differs from the folder's name")
    if sorted(roles) != sorted(ROLES):
        raise TableError(path, 1, f"roles are {sorted(roles)}, expected {sorted(ROLES)}")
    check_keys(path, "repetition", repetition, ("count_within", "symbol"))
    if repetition["count_within"] not in ("T2", "exposure"):
        raise TableError(path, 1, "repetition.count_within is neither T2 nor exposure")
    for key in (texts["document"], subtense.source, field.source):
        if key not in sources:
            raise TableError(path, 1, f"source {key!r} is not in sources.toml")
    return {
        **texts,
        "digest": digest_of([folder / name for name in tables] + [path, additivity]),
        "path": folder,
        "sources": sources,
        "limits": read_rows(folder / "limits.csv", LimitRow, sources),
        "factors": read_rows(folder / "factors.csv", FactorRow, sources),
        "repetition": read_rows(folder / "repetition.csv", RepetitionRow, sources),
        "additivity": read_rows(additivity, AdditivityRow, sources),
        "roles": roles,
        "subtense": subtense,
        "field": field,
        "repetition_symbol": repetition["symbol"],
        "count_within": repetition["count_within"],
        "shared_wavelengths_nm": tuple(map(float, shared["wavelength_nm"])),
        "shared_times_s": tuple(map(float, shared["time_s"])),
        "coverage": coverage,
    }
