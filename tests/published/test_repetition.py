"""Limits per pulse of pulse trains, under `eu-2006-25`: its family keeps the printed limits of 1993.

N = rate x T, at least 1, not rounded; pulses closer than T_min (18 us at 488 nm) share the limit at T_min.
"""

from __future__ import annotations

import pytest

from service.contract.result import Criterion
from tests.published.cases import Case, check, pinned
from tests.published.product import EU, evaluate, train


def criteria(case: Case) -> dict[str, Criterion]:
    """The strictest eye criterion of each rule of the case's pulse train.

    `train` has two: on the directive's boundary at 18 us or 50 us the rows of both sides hold.
    """
    found = evaluate(
        EU,
        case.inputs["wavelength_nm"],
        train(case.inputs["pulse_duration_s"], case.inputs["prf_Hz"]),
        case.inputs["exposure_s"],
    ).eye.criteria
    by_rule = {row.rule: row for row in sorted(found, key=lambda row: -row.limit_j_m2)}
    assert sorted(by_rule) == ["average", "single", "train"]
    return by_rule


@pinned("IEC-AR-1MHz")
def test_average_power_rule(case: Case) -> None:
    """Rule 2: 18 x 0.25^0.75 J/m2 shared by N = 250 000 pulses is the strictest.

    Rule 1 is 5e-3 J/m2. Rule 3 of the case, 5e-3 N^-0.25 = 2.2e-4, counts every pulse; the directive groups
    18 of them into one of 18 us: 18 (18e-6)^0.75 (0.25 / 18e-6)^-0.25 / 18 = 18 x 0.25^-0.25 x 1e-6, by hand
    the same 2.55e-5 as rule 2.
    """
    rows = criteria(case)
    check(case, rows["average"].limit_j_m2)
    check(case, min(row.limit_j_m2 for row in rows.values()))
    check(case, rows["train"].limit_j_m2)
    assert rows["average"].pulses == pytest.approx(250_000)
    assert rows["single"].limit_j_m2 == pytest.approx(5e-3)


@pinned("IEC-RF-MPE")
def test_range_finder(case: Case) -> None:
    """12 shots per minute for 10 s: N = 2, C_P = 2^-0.25 = 0.841, 5e-2 J/m2 x C_P per pulse."""
    rows = criteria(case)
    check(case, rows["train"].limit_j_m2)
    check(case, min(row.limit_j_m2 for row in rows.values()))
    assert rows["train"].pulses == pytest.approx(2.0)
    assert rows["train"].pulse_factor == pytest.approx(0.8409, abs=5e-5)
