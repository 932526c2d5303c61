"""Where a printed value is of an older edition: the newer one, as the note of the case has it.

These do not pin the printed value; they show why it is not to be expected. Newer values are from memory:
ICNIRP 2013, ANSI Z136.1-2014, and Directive 2006/25/EC Table 2.3 for the limits that came in 2000.
"""

from __future__ import annotations

import math
from typing import Any

import pytest

from tests.published.cases import CASES, UNITS
from tests.published.product import ANSI, EU, ICNIRP, cw, evaluate, factor, limit, pulse

DAY_S = 3e4

#: Case, rule set and emission; the newer value stands beside the printed one, as `newer`.
PULSED = [
    ("LAW-VIS-PS", ICNIRP, pulse(1e-12)),
    ("LAW-1064-NS", ICNIRP, pulse(1e-8)),
    ("AN-YAG-Q", ANSI, pulse(2e-8)),
]
LONG = [
    ("OM-633-8h", ANSI),
    ("OM-840-8h", ANSI),
    ("OM-1064-8h", ANSI),
    ("AN-905-CW", ANSI),
    ("AN-1310-CW", EU),
]


@pytest.mark.parametrize(("name", "rules", "emission"), PULSED, ids=[p[0] for p in PULSED])
def test_pulse(name: str, rules: str, emission: dict[str, Any]) -> None:
    case = CASES[name]
    assert case.newer is not None
    found = limit(rules, case.inputs["wavelength_nm"], emission)[0] / UNITS[case.unit]
    assert found == pytest.approx(case.newer.value, rel=1e-12), f"newer {case.newer}. {case}"


@pytest.mark.parametrize(("name", "rules"), LONG, ids=[p[0] for p in LONG])
def test_day(name: str, rules: str) -> None:
    case = CASES[name]
    assert case.newer is not None
    found = limit(rules, case.inputs["wavelength_nm"], cw(), DAY_S)[1] / UNITS[case.unit]
    assert found == pytest.approx(case.newer.value, abs=case.newer.tolerance + 1e-9), f"{case.newer}. {case}"


def test_the_newer_limit_behind_the_printed_distance_at_514_5_nm() -> None:
    """1e-3 W/cm2, thermal: the photochemical limit with C_B = 10^1.29 is larger."""
    assert limit(ANSI, 514.5, cw(), DAY_S)[1] == pytest.approx(10.0, rel=1e-12)


def test_density_with_the_newer_limit() -> None:
    """FMA-OD64 with 2e-6 instead of 5e-6 J/cm2: log10(12.5 / 2e-6) = 6.80, by hand."""
    case, width = CASES["FMA-OD64"], 10e-3
    energy = case.inputs["radiant_exposure_J_cm2"] * 1e4 * math.pi / 4 * width**2
    result = evaluate(ICNIRP, 1064, pulse(1e-9, energy), profile="tophat", diameter_mm=width * 1e3)
    assert case.newer is not None
    assert result.eye.optical_density == pytest.approx(case.newer.value, abs=0.05), str(case)


def test_c_c_of_2013() -> None:
    """8 + 10^(0.04 (lambda - 1250)): 8.01 at 1200 nm, 9 at 1250 nm, 108 at 1300 nm, by hand."""
    found = [factor(ICNIRP, "C_C", wavelength) for wavelength in (1200.0, 1250.0, 1300.0)]
    assert found == pytest.approx([8.01, 9.0, 108.0], rel=1e-12), str(CASES["LAW-CC1200"])
