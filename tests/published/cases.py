"""What the checks of this folder share: published cases, their tolerance, and the product asked for them.

A case is a printed number with its source. `how_known` says whether the source was read or is recalled
from memory; `trust` is A (firm) or B (usable, mind edition and rounding). A case is met when the value
of the product lies within half a unit in the last printed digit, or within a tolerance that the check
states beside it.

Not used, because the product has no such quantity (yet):

- a diffuse reflector: OSHA-CO2-8h-diffuse, OSHA-AR-8h-diffuse, OSHA-AR-0.25s-diffuse,
  OSHA-YAG-8h-diffuse, OSHA-YAG-10s-diffuse
- binoculars: BIN-EXIT; diffraction rings: G-AIRY; gain media: R-FSAT, R-ISAT

Not used, because no rule set of the product kept the printed cell:

- visible retinal limits of 1986 for long exposures, replaced in 2000: OM-633-8h, OM-647-600, OM-647-8h,
  OM-568-600, OM-514-600, OM-514-8h
- near-infrared limits for a day, 0.32 C_A mW/cm2 until 1999, 1 C_A since: OM-840-8h, OM-1064-8h, AN-905-CW,
  AN-1310-CW (`test_editions.py` checks what replaced these four and OM-633-8h)
"""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import dataclass
from decimal import Decimal
from pathlib import Path
from typing import Any

import pytest

__all__ = ["CASES", "PINNED", "UNITS", "Case", "check", "half_a_unit", "pinned"]

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


@dataclass(frozen=True, slots=True)
class Case:
    """One published case, as `cases.json` has it."""

    id: str
    source: str
    how_known: str
    quantity: str
    inputs: dict[str, Any]
    printed_value: float
    unit: str
    printed_precision: int
    edition: str
    formula: str
    trust: str
    notes: str

    def __str__(self) -> str:
        return (
            f"{self.id}: {self.quantity}; printed {self.printed_value:g} {self.unit} "
            f"({self.edition}), {self.source}, {self.how_known}"
        )


CASES: dict[str, Case] = {
    entry["id"]: Case(**entry)
    for entry in json.loads(Path(__file__).with_name("cases.json").read_text(encoding="utf-8"))
}

#: Ids that a check pins; filled when the test modules are read.
PINNED: list[str] = []


def pinned(*ids: str) -> Callable[..., Any]:
    """Parametrise a test with the cases of these ids and count them as pinned."""
    PINNED.extend(ids)
    return pytest.mark.parametrize("case", [CASES[i] for i in ids], ids=ids)


def half_a_unit(printed: float, digits: int) -> float:
    """Half a unit in the last of `digits` significant digits: 0.5 for 86 in two, 0.05 for 2.6 in two."""
    return float(Decimal(5).scaleb(Decimal(repr(float(printed))).adjusted() - digits))


def check(case: Case, value: float, tolerance: float | None = None) -> None:
    """The product's `value` [SI] agrees with the printed one; `tolerance` is in the printed unit."""
    found = float(value) / UNITS[case.unit]
    allowed = half_a_unit(case.printed_value, case.printed_precision) if tolerance is None else tolerance
    # A hair more than allowed, so that binary rounding of a printed constant decides nothing.
    off = abs(found - case.printed_value)
    assert off <= allowed + 1e-12 * abs(case.printed_value), (
        f"product {found:.6g} {case.unit}, off by {off:.3g}, allowed {allowed:.3g}. {case}"
    )
