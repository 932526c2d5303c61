"""What the checks of this folder share: published cases, their tolerance, and the product asked for them.

A case is a printed number with its source, as `data/checks/published.toml` has it: the running service
computes the same cases on its page /checks, here they are asked for independently. `how_known` says
whether the source was read or is recalled from memory; `trust` is A (firm) or B (usable, mind edition
and rounding). A case is met when the value of the product lies within half a unit in the last printed
digit, or within a tolerance that the check states beside it.

Not used, because the product has no such quantity (yet):

- binoculars: BIN-EXIT; diffraction rings: G-AIRY; gain media: R-FSAT, R-ISAT

Not used, because no rule set of the product kept the printed cell:

- visible retinal limits of 1986 for long exposures, replaced in 2000: OM-633-8h, OM-647-600, OM-647-8h,
  OM-568-600, OM-514-600, OM-514-8h
- diffuse reflections at those limits: OSHA-AR-8h-diffuse, OSHA-YAG-8h-diffuse
- near-infrared limits for a day, 0.32 C_A mW/cm2 until 1999, 1 C_A since: OM-840-8h, OM-1064-8h, AN-905-CW,
  AN-1310-CW (`test_editions.py` checks what replaced these four and OM-633-8h)
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from service.contract.checks import UNITS, PublishedCheck, half_a_unit, published_checks

__all__ = ["CASES", "PINNED", "UNITS", "Case", "check", "pinned"]

Case = PublishedCheck

CASES = published_checks()

#: Ids that a check pins; filled when the test modules are read.
PINNED: list[str] = []


def pinned(*ids: str) -> Callable[..., Any]:
    """Parametrise a test with the cases of these ids and count them as pinned."""
    PINNED.extend(ids)
    return pytest.mark.parametrize("case", [CASES[i] for i in ids], ids=ids)


def check(case: Case, value: float, tolerance: float | None = None) -> None:
    """The product's `value` [SI] agrees with the printed one; `tolerance` is in the printed unit."""
    found = float(value) / UNITS[case.unit]
    allowed = half_a_unit(case.printed_value, case.printed_precision) if tolerance is None else tolerance
    # A hair more than allowed, so that binary rounding of a printed constant decides nothing.
    off = abs(found - case.printed_value)
    assert off <= allowed + 1e-12 * abs(case.printed_value), (
        f"product {found:.6g} {case.unit}, off by {off:.3g}, allowed {allowed:.3g}. {case}"
    )
