"""Correction factors and break times, asked of the compiled rule sets."""

from __future__ import annotations

import math

from tests.published.cases import Case, check, pinned
from tests.published.product import EU, IEC, evaluate, factor, train


@pinned("LAW-CC1200")
def test_c_c(case: Case) -> None:
    """8.0 from 1200 to 1400 nm.

    At 1200 nm itself the directive's stricter neighbour holds, 10^(0.018 x 50) = 10^0.9 = 7.943, which
    prints as 7.9: 0.06 below the printed 8.0, the step the table has there.
    """
    for wavelength in (1200.001, 1300.0, 1400.0):
        check(case, factor(EU, "C_C", wavelength), 0.0)
    check(case, factor(EU, "C_C", 1200.0), 0.06)


@pinned("LAW-T1")
def test_t1(case: Case) -> None:
    """100 s from 500 nm on, met there by 10 x 10^(0.02 (lambda - 450))."""
    at = case.inputs["wavelength_nm"]
    for wavelength in (math.nextafter(at, 0.0), at, 550.0):
        check(case, factor(EU, "T1", wavelength), 1e-6)


@pinned("LAW-T2")
def test_t2(case: Case) -> None:
    """100 s from 100 mrad on, met there by 10 x 10^((alpha - 1.5) / 98.5)."""
    at = case.inputs["angular_subtense_mrad"]
    for alpha in (math.nextafter(at, 0.0), at, 150.0):
        check(case, factor(EU, "T2", alpha), 1e-6)


@pinned("IEC14-AMAX1")
def test_alpha_max(case: Case) -> None:
    """5 mrad up to 625 us, met there by 200 t^0.5; held to five digits instead of one."""
    for seconds in (1e-5, case.inputs["exposure_s"]):
        check(case, factor(IEC, "alpha_max", seconds) * 1e-3, 5e-5)


@pinned("IEC14-C5-40")
def test_c5_floor(case: Case) -> None:
    """C5 = N^-0.25 down to 0.4, reached at N = 40.

    Pulses of 10 ms at 20 Hz: longer than T_i, alpha_max(10 ms) = 200 x 0.01^0.5 = 20 mrad, so a source of
    10 mrad lies between 5 mrad and alpha_max; 2 s hold 40 pulses, 3 s hold 60.
    """

    def c5(exposure_s: float) -> float:
        rows = evaluate(IEC, 633, train(0.01, 20.0), exposure_s, subtense_mrad=10.0).eye.criteria
        (row,) = (row for row in rows if row.rule == "train")
        assert row.pulses == 20.0 * exposure_s
        return row.pulse_factor

    assert case.inputs["N"] == 40
    check(case, c5(2.0), 0.005)  # 40^-0.25 = 0.3976, by hand: prints as 0.40
    check(case, c5(3.0), 0.0)  # the floor itself
