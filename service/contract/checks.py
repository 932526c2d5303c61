"""Published values computed anew: each printed value beside what this service answers, with a verdict.

`data/checks/published.toml` has the printed values with their sources and how each is asked for. A check
is met when the answer lies within half a unit in the last printed digit, or within the tolerance that the
table states beside it.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, field
from decimal import Decimal
from functools import cache
from pathlib import Path
from typing import Any

from pydantic import BaseModel, Field

from service.contract.check_values import READERS
from service.files import DATA
from service.rules.tables import TableError, read_toml

__all__ = [
    "SUBJECTS",
    "UNITS",
    "CheckResult",
    "Checks",
    "Newer",
    "PublishedCheck",
    "checks",
    "half_a_unit",
    "published_checks",
]

#: Size of each printed unit in SI (angles in rad, lengths in m, fractions as such).
UNITS = {
    "J/m2": 1.0,
    "J/cm2": 1e4,
    "W/m2": 1.0,
    "W/cm2": 1e4,
    "mW/cm2": 10.0,
    "J": 1.0,
    "mW": 1e-3,
    "s": 1.0,
    "m": 1.0,
    "km": 1e3,
    "ft": 0.3048,
    "mrad": 1e-3,
    "%": 0.01,
    "OD": 1.0,
    "LB": 1.0,
    "1": 1.0,
}
#: Subjects in the order of the page, with their headings.
SUBJECTS = {
    "eye": "Exposure limits of the eye",
    "skin": "Exposure limits of the skin",
    "factors": "Correction factors and break times",
    "pulse trains": "Pulse trains",
    "powers": "Powers through an aperture",
    "beams": "Beams",
    "distances": "Hazard distances",
    "optical density": "Optical density",
    "classes": "Hazard classes",
    "eyewear": "Scale numbers of eyewear",
}


@dataclass(frozen=True, slots=True)
class Newer:
    """What replaced a printed value, with a tolerance in the printed unit; `ask` where asked differently."""

    value: float
    tolerance: float
    reason: str
    ask: dict[str, Any] | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class PublishedCheck:
    """One entry of the table. `tolerance` is in the printed unit; None = half a unit in the last digit.

    `how_known` says whether the source was read or is recalled from memory; `trust` is A (firm) or B
    (usable, mind edition and rounding).
    """

    id: str
    subject: str
    quantity: str
    printed_value: float
    unit: str
    printed_precision: int
    known: str
    how_known: str
    source: str
    edition: str
    formula: str
    trust: str
    notes: str
    inputs: dict[str, Any] = field(hash=False)
    ask: dict[str, Any] = field(hash=False)
    tolerance: float | None = None
    tolerance_reason: str = ""
    newer: Newer | None = None

    def __str__(self) -> str:
        return (
            f"{self.id}: {self.quantity}; printed {self.printed_value:g} {self.unit} "
            f"({self.edition}), {self.source}, {self.how_known}"
        )


class CheckResult(BaseModel):
    """One printed value beside the computed one."""

    id: str
    subject: str
    quantity: str
    printed: float = Field(description="As printed, in `unit`.")
    unit: str
    expected: float = Field(description="What the answer must be: the printed value, or what replaced it.")
    replaced_by: str | None = Field(description="Why a newer value is expected; null: the printed one is.")
    computed: float | None = Field(description="What this service computes; null where it failed.")
    deviation: float | None = Field(description="computed - expected, in `unit`.")
    allowed: float = Field(description="Largest deviation that meets the check, in `unit`.")
    allowed_because: str
    met: bool
    source: str
    edition: str
    known: str = Field(description="read, or memory: the source was not read again.")
    how_known: str
    notes: str
    ask: dict[str, Any] = Field(description="What was computed; units stand in the names.")


class Checks(BaseModel):
    """Every published check, computed by this process."""

    met: int
    failed: list[str] = Field(description="Ids of the checks that are not met.")
    checks: list[CheckResult]


def half_a_unit(printed: float, digits: int) -> float:
    """Half a unit in the last of `digits` significant digits: 0.5 for 86 in two, 0.05 for 2.6 in two."""
    return float(Decimal(5).scaleb(Decimal(repr(float(printed))).adjusted() - digits))


def published_checks(path: Path = DATA / "checks" / "published.toml") -> dict[str, PublishedCheck]:
    """The table, by id. Raises TableError on an unknown field, subject, unit or a repeated id."""
    found: dict[str, PublishedCheck] = {}
    for entry in read_toml(path)["check"]:
        name = entry.get("id", "?")
        try:
            newer = entry.pop("newer", None)
            check = PublishedCheck(**entry, newer=None if newer is None else Newer(**newer))
        except TypeError as error:
            raise TableError(path, 1, f"check {name}: {error}") from None
        asked = [check.ask] if newer is None else [check.ask, newer.get("ask") or check.ask]
        faults = [
            (check.id in found, "it stands twice"),
            (check.subject not in SUBJECTS, f"subject {check.subject!r} is not one of {', '.join(SUBJECTS)}"),
            (check.unit not in UNITS, f"unit {check.unit!r} is not one of {', '.join(UNITS)}"),
            (check.known not in ("read", "memory"), "known is neither read nor memory"),
            (not check.source.strip(), "it has no source"),
            (any(a.get("read") not in READERS for a in asked), f"ask.read is none of {', '.join(READERS)}"),
        ]
        for wrong, words in faults:
            if wrong:
                raise TableError(path, 1, f"check {name}: {words}")
        found[check.id] = check
    return found


@cache
def checks() -> Checks:
    """Every check, computed once per process; one that cannot be computed is not met."""
    results = [result for check in published_checks().values() for result in _results(check)]
    failed = [r.id for r in results if not r.met]
    return Checks(met=len(results) - len(failed), failed=failed, checks=results)


def _results(check: PublishedCheck) -> list[CheckResult]:
    """The printed value where a rule set has it, and the newer one where there is one."""
    newer, found = check.newer, []
    if newer is None or newer.ask is not None:
        half = half_a_unit(check.printed_value, check.printed_precision)
        because = check.tolerance_reason or "half a unit in the last printed digit"
        allowed = half if check.tolerance is None else check.tolerance
        found.append(_result(check, check.id, check.ask, check.printed_value, allowed, because, None))
    if newer is not None:
        name = check.id if newer.ask is None else f"{check.id}-newer"
        ask = newer.ask or check.ask
        found.append(_result(check, name, ask, newer.value, newer.tolerance, newer.reason, newer.reason))
    return found


def _result(
    check: PublishedCheck,
    name: str,
    ask: dict[str, Any],
    expected: float,
    allowed: float,
    because: str,
    replaced_by: str | None,
) -> CheckResult:
    reader: Callable[[dict[str, Any]], float] = READERS[ask["read"]]
    computed: float | None
    try:
        computed = reader(ask) / UNITS[check.unit]
    except Exception:  # whatever goes wrong, the check is not met and the page says so
        computed = None
    off = None if computed is None or not math.isfinite(computed) else computed - expected
    # A hair more than allowed, so that binary rounding of a printed constant decides nothing.
    met = off is not None and abs(off) <= allowed + 1e-12 * abs(expected)
    return CheckResult(
        id=name,
        subject=check.subject,
        quantity=check.quantity,
        printed=check.printed_value,
        unit=check.unit,
        expected=expected,
        replaced_by=replaced_by,
        computed=None if off is None else computed,
        deviation=off,
        allowed=allowed,
        allowed_because=because,
        met=met,
        source=check.source,
        edition=check.edition,
        known=check.known if replaced_by is None else "memory",
        how_known=check.how_known
        if replaced_by is None
        else "newer value from memory; printed: " + check.how_known,
        notes=check.notes,
        ask=ask,
    )
