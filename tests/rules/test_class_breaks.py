"""The jumps of the emission limits at their printed breaks, each pinned to the printed precision of its step.

Worked out from the printed numbers of IEC 60825-1:2014 Tables 3 to 8 and 21 CFR 1040.10(d) (all from
memory): a row typed wrongly would change its step.
"""

from __future__ import annotations

import math

import pytest

from tests.rules.class_engine import IEC, SCHEMES, US, dose, factor
from tests.rules.engine import IEC as MPE
from tests.rules.engine import limit
from tests.rules.test_breaks import percent, printed

JUST = math.nextafter

#: Areas of the apertures as printed [m2].
AREAS = {"7": "3.8485e-5", "1": "7.854e-7", "3.5": "9.621e-6", "1.5": "1.767e-6"}


def area(mm: float) -> float:
    return math.pi / 4 * (mm * 1e-3) ** 2


def test_printed_areas() -> None:
    assert all(printed(text, area(float(mm))) for mm, text in AREAS.items())


# Exposure limit x aperture area against the printed Class 1 limit: wavelength nm, time s, aperture mm,
# area x MPE, Class 1 limit, and its excess in %; per second where the limit is a power.
AREA_CHECKS = [
    (550.0, 5e-12, 7.0, "3.85e-8", 3.8e-8, "-1.3"),
    (550.0, 1e-7, 7.0, "7.70e-8", 7.7e-8, "0"),
    (550.0, 1.0, 7.0, "6.93e-4", 7e-4, "+1.1"),
    (1064.0, 1.0, 7.0, "3.46e-3", 3.5e-3, "+1.1"),
    (430.0, 50.0, 7.0, "3.85e-3", 3.9e-3, "+1.3"),
    (633.0, 100.0, 7.0, "3.85e-4", 3.9e-4, "+1.3"),
    (350.0, 1e-10, 1.0, "2.36e4", 2.4e4, "+1.9"),
    (1450.0, 1e-10, 1.0, "7.85e5", 8e5, "+1.9"),
    (1450.0, 0.1, 1.0, "4.40e-3", 4.4e-3, "0"),
    (1450.0, 100.0, 3.5, "9.62e-3", 1e-2, "+3.9"),
    # 1e4 J/m2 x 1.767e-6 m2 x t^0.75
    (1550.0, 1.0, 1.5, "1.77e-2", 1.8e-2, "+1.9"),
    # 5600 x 1.767e-6 x t^(0.25 + 0.75)
    (1450.0, 1.0, 1.5, "9.90e-3", 1e-2, "+1.1"),
]


def scale(t: float, wavelength: float) -> float:
    """What a Class 1 limit is printed per: the time of a power, the root of a power law, else 1."""
    if t in (100.0, 1e-10):
        return t
    return t**0.25 if (t, wavelength) == (0.1, 1450.0) else 1.0


@pytest.mark.parametrize("case", AREA_CHECKS, ids=lambda c: f"{c[0]:g}nm-{c[1]:g}s")
def test_class_1_is_the_exposure_limit_through_the_aperture(case: tuple) -> None:
    wavelength, t, mm, text, value, excess = case
    effect = "photochemical" if wavelength == 430 else "thermal"
    tissue = "lens" if wavelength < 400 else "retina" if wavelength < 1400 else "cornea"
    per = scale(t, wavelength)
    through = limit(MPE, wavelength, t, 1.5, tissue, effect) * area(mm) / per
    found = dose(IEC, "1", wavelength, t) / per
    assert found == pytest.approx(value, rel=1e-12)
    assert printed(text, through), through
    # The excess as printed: of 1e-2 against 9.62e-3, 3.9 %; in the last digit of the rounded product.
    assert abs(percent(through, found) - float(excess)) <= 0.15, percent(through, found)


#: Scheme, class, wavelength nm, break s, subtense mrad, below, above, step in %; "" where not printed.
TIME_BREAKS = [
    (IEC, "1", 550.0, 5e-6, 1.5, "7.7e-8", "7.40e-8", "-3.9"),
    (IEC, "1", 1064.0, 1.3e-5, 1.5, "7.7e-7", "7.58e-7", "-1.6"),
    (IEC, "1", 550.0, 10.0, 1.5, "3.94e-3", "3.9e-3", "-0.9"),
    (IEC, "1", 850.0, 10.0, 1.5, "", "", "-0.9"),
    (IEC, "1", 1064.0, 10.0, 1.5, "1.968e-2", "1.95e-2", "-0.9"),
    (IEC, "1", 1450.0, 1e-3, 1.5, "8e-4", "", "-2.2"),
    (IEC, "1", 2000.0, 1e-3, 1.5, "8e-4", "", "-2.2"),
    (IEC, "1", 1450.0, 0.35, 1.5, "", "3.5e-3", "+3.4"),
    (IEC, "1", 2000.0, 0.35, 1.5, "", "3.5e-3", "+3.4"),
    (IEC, "1", 3000.0, 0.35, 1.5, "", "3.5e-3", "+3.4"),
    (IEC, "1", 1550.0, 0.35, 1.5, "8e-3", "", "+2.4"),
    (IEC, "1", 1550.0, 10.0, 1.5, "", "0.1", "-1.2"),
    (IEC, "1", 1450.0, 10.0, 1.5, "0.1", "0.1", "0"),
    (IEC, "2", 550.0, 0.25, 1.5, "2.475e-4", "2.5e-4", "+1.0"),
    (IEC, "2", 550.0, 5e-6, 1.5, "7.7e-8", "7.40e-8", "-3.9"),
    # 3.8e-7 against 3.5e-3 x (5e-6)^0.75
    (IEC, "3R", 550.0, 5e-6, 1.5, "3.8e-7", "", "-2.6"),
    (IEC, "3R", 850.0, 5e-6, 1.5, "", "", "-2.6"),
    (IEC, "3R", 550.0, 0.25, 1.5, "", "1.25e-3", "+1.0"),
    # 1.8e-2 x (1.3e-5)^0.75 = 3.897e-6: 2.55 % above 3.8e-6
    (IEC, "3R", 1064.0, 1.3e-5, 1.5, "3.8e-6", "3.897e-6", "+2.55"),
    (IEC, "3R", 850.0, 10.0, 1.5, "", "", "+1.6"),
    # 1.8e-2 x 10^0.75 against 2e-3 x 5 x 10
    (IEC, "3R", 1064.0, 10.0, 1.5, "0.1012", "0.1", "-1.2"),
    (IEC, "3B", 550.0, 0.06, 1.5, "0.03", "0.03", "0"),
    (IEC, "3B", 550.0, 1e-9, 1.5, "0.03", "0.03", "0"),
    (IEC, "3B", 850.0, 1e-9, 1.5, "", "", "0"),
    (IEC, "3B", 1064.0, 1e-9, 1.5, "0.15", "0.15", "0"),
    (IEC, "3B", 10600.0, 1e-9, 1.5, "0.125", "0.125", "0"),
    (IEC, "3B", 250.0, 1e-9, 1.5, "3.8e-4", "3.8e-4", "0"),
    (IEC, "3B", 250.0, 0.25, 1.5, "3.8e-4", "3.75e-4", "-1.3"),
    (IEC, "3B", 355.0, 0.25, 1.5, "0.125", "0.125", "0"),
    (IEC, "3B", 10600.0, 0.25, 1.5, "0.125", "0.125", "0"),
    # 0.15 J against 0.5 W x 0.25 s: an inherent step of the table
    (IEC, "3B", 1064.0, 0.25, 1.5, "0.15", "0.125", "-17"),
    # 5 x Class 1 and 5 x the same power law on both sides
    (IEC, "1", 550.0, 10.0, 30.0, "", "", "0"),
    (IEC, "1", 1064.0, 10.0, 30.0, "", "", "0"),
    (US, "I", 550.0, 2e-5, 1.5, "2e-7", "2.09e-7", "+4.7"),
    (US, "I", 550.0, 10.0, 1.5, "3.936e-3", "3.9e-3", "-0.9"),
    (US, "I", 550.0, 1e4, 1.5, "3.9e-3", "3.9e-3", "0"),
    (US, "I", 550.0, 1e-9, 1.5, "2e-7", "2e-7", "0"),
    (US, "I", 1064.0, 1e4, 1.5, "", "", "0"),
    # 7.9e-5 J / 4.4e-3 (1e-7)^0.25; 4.4e-3 x 10^0.25 / 7.9e-3
    (US, "I", 2000.0, 1e-7, 1.5, "7.9e-5", "", "-1.0"),
    (US, "I", 2000.0, 10.0, 1.5, "", "7.9e-3", "+1.0"),
    (US, "I", 10600.0, 1e-7, 1.5, "100", "", "-0.4"),
    (US, "I", 10600.0, 10.0, 1.5, "", "1e4", "+0.4"),
    (US, "IIa", 550.0, 1e3, 1.5, "3.9e-3", "3.9e-3", "0"),
    (US, "II", 550.0, 0.25, 1.5, "2.475e-4", "2.5e-4", "+1.0"),
    (US, "IIIa", 550.0, 3.8e-4, 1.5, "1.905e-6", "1.9e-6", "-0.3"),
    (US, "IIIb", 250.0, 0.25, 1.5, "3.8e-4", "3.75e-4", "-1.3"),
]


@pytest.mark.parametrize("case", TIME_BREAKS, ids=lambda c: f"{c[1]}-{c[2]:g}nm-{c[3]:g}s-{c[4]:g}")
def test_steps_in_time(case: tuple) -> None:
    scheme, target, wavelength, t, alpha, below_text, above_text, step = case
    below = dose(scheme, target, wavelength, JUST(t, 0), alpha)
    above = dose(scheme, target, wavelength, JUST(t, math.inf), alpha)
    assert printed(step, percent(below, above)), (below, above, percent(below, above))
    assert not below_text or printed(below_text, below), below
    assert not above_text or printed(above_text, above), above


#: Class, wavelength nm, time s, below, above, step %.
WAVELENGTH_BREAKS = [
    # 0.03 C4 = 0.1504 against 0.15
    (IEC, "3B", 1050.0, 1e-3, "0.1504", "0.15", "-0.2"),
    # 1.25e-5 C2(315) = 0.125
    (IEC, "3B", 315.0, 1e-3, "0.125", "0.125", "0"),
    (IEC, "3B", 700.0, 1e-3, "0.03", "0.03", "0"),
    (IEC, "1", 700.0, 100.0, "3.9e-2", "3.9e-2", "0"),
    # 10^(100/515) on both sides, k2 = t x 101/10100 and t/100
    (US, "I", 800.0, 1e3, "", "", "0"),
    # 10^(360/515) = 5.0007 against 5.0
    (US, "I", 1060.0, 1e-3, "", "", "0.0"),
    (US, "I", 700.0, 1e-3, "", "", "0"),
    (US, "IIIb", 302.4, 1e-3, "3.8e-4", "3.8e-4", "0"),
]


@pytest.mark.parametrize("case", WAVELENGTH_BREAKS, ids=lambda c: f"{c[1]}-{c[2]:g}nm-{c[3]:g}s")
def test_steps_in_wavelength(case: tuple) -> None:
    scheme, target, wavelength, t, below_text, above_text, step = case
    below = dose(scheme, target, JUST(wavelength, 0), t)
    above = dose(scheme, target, JUST(wavelength, math.inf), t)
    assert printed(step, percent(below, above)), (below, above)
    assert not below_text or printed(below_text, below), below
    assert not above_text or printed(above_text, above), above


def test_ultraviolet_joins() -> None:
    """C2(302.5) = 31.6 against 30, +5.4 %; C1 = C2 at T1 with a ratio of 0.996 (Table 9)."""
    c2 = factor(IEC, "C2", 302.5)
    assert (printed("31.6", c2), printed("+5.4", percent(30, c2))) == (True, True)
    below = dose(IEC, "1", JUST(302.5, 0), 1.0)
    above = dose(IEC, "1", 302.5, 1.0) / 7.9e-7
    assert (below, printed("31.6", above)) == (30.0, True)
    for target in ("1", "3R"):
        for nm in (304.0, 308.0, 312.0):
            t1 = factor(IEC, "T1", nm)
            thermal, blue = (dose(IEC, target, nm, t1 * (1 + s)) for s in (-1e-9, 1e-9))
            assert printed("0.996", thermal / blue)


def test_the_ultraviolet_power_of_class_i_at_a_day() -> None:
    """8.0e-10 W x 3e4 s = 2.4e-5 J: the limit printed beyond a day begins where this one ends."""
    assert dose(US, "I", 250.0, 3e4) == pytest.approx(8.0e-10 * 3e4, rel=1e-12)


def test_k1_and_k2_meet() -> None:
    """Table IV: k1(315) 331.1 against 330, -0.3 %; k1(1060) 5.0007 against 5.0; k2 as printed."""
    below, above = factor(US, "k1", JUST(315, 0)), factor(US, "k1", JUST(315, 316))
    assert (printed("331.1", below), above, printed("-0.3", percent(below, above))) == (True, 330, True)
    below, above = factor(US, "k1", JUST(1060, 0)), factor(US, "k1", 1060.0)
    assert (printed("5.0007", below), above) == (True, 5)

    def k2(nm: float, t: float) -> float:
        """From the Class I limits of 750 nm and of 650 nm (k2 = 1), k1 taken out."""
        return dose(US, "I", nm, t) / dose(US, "I", 650.0, t) / factor(US, "k1", nm)

    for nm, t, text in (
        (750.0, 10100 / 51, "1"), (750.0, 1e4, "50.5"), (900.0, 100.0, "1"), (900.0, 1e4, "100"),
        (900.0, 3e4, "100"), (750.0, 3e4, "50.5"), (800.0, 500.0, "5.00"), (JUST(800, 0), 500.0, "5.00"),
    ):  # fmt: skip
        assert printed(text, k2(nm, t)), (nm, t)


def test_extended_rows_meet_at_t2() -> None:
    """7e-4 t^0.75 = 7e-4 T2^-0.25 t at t = T2, and so for Class 3R beyond 700 nm: 0 %."""
    for target, wavelengths in (("1", (650.0, 850.0, 1064.0)), ("3R", (850.0, 1064.0))):
        for nm in wavelengths:
            t2 = factor(IEC, "T2", 30.0)
            below, above = (dose(IEC, target, nm, t2 * (1 + s), 30.0) for s in (-1e-12, 1e-12))
            assert percent(below, above) == pytest.approx(0.0, abs=1e-8)


def test_class_3b_meets_at_0_06_c4() -> None:
    """0.03 C4 J = 0.5 W x 0.06 C4 s: 0 %."""
    for nm in (700.0, 785.0, 850.0, 1049.0):
        t = factor(IEC, "T_3B", nm)
        below, above = (dose(IEC, "3B", nm, t * (1 + s)) for s in (-1e-12, 1e-12))
        assert percent(below, above) == pytest.approx(0.0, abs=1e-8)


def test_class_3r_is_five_times_class_1_or_2() -> None:
    """Tables 3 to 7: 3R allows five times as much, to the rounding of the printed numbers (2.6 %)."""
    for nm, t, lower in (
        (308.0, 1e-7, "1"), (350.0, 1.0, "1"), (350.0, 100.0, "1"), (550.0, 0.25, "2"), (550.0, 1e-3, "1"),
        (850.0, 1e-3, "1"), (850.0, 100.0, "1"), (1064.0, 1e-8, "1"), (1064.0, 100.0, "1"),
        (1450.0, 1.0, "1"), (1550.0, 1.0, "1"), (1550.0, 1e-6, "1"), (3000.0, 1e-8, "1"), (10600.0, 1.0, "1"),
    ):  # fmt: skip
        ratio = dose(IEC, "3R", nm, t) / dose(IEC, lower, nm, t)
        assert ratio == pytest.approx(5.0, rel=0.027), (nm, t)


def test_schemes_agree_where_they_print_the_same() -> None:
    """1 mW, 5 mW and 0.5 W in the visible at 0.25 s and beyond (both schemes, from memory)."""
    for t in (0.25, 10.0, 100.0):
        pairs = (("2", "II"), ("3R", "IIIa"), ("3B", "IIIb"))
        for ours, theirs in pairs:
            assert dose(SCHEMES[0], ours, 633.0, t) == pytest.approx(dose(SCHEMES[1], theirs, 633.0, t))
