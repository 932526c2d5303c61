"""The jumps at the printed breaks, each pinned to the printed precision of its step.

Every document's numbers leave small steps where two rows or two pieces of a factor meet. They were worked
out from the printed numbers; a row typed wrongly would change its step. ICNIRP 2013, IEC 60825-1:2014 and
ANSI Z136.1-2014: from memory; 2006/25/EC: read, Table 2.3 (10 s and beyond) from memory. Left out: area
rules of the skin (not tabled) and accessible emission limits.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from tests.rules.engine import ANSI, EU, ICNIRP, IEC, RULES, aperture_mm, compiled, factor, limit, named

JUST = math.nextafter


def percent(below: float, above: float) -> float:
    return 100 * (above / below - 1)


def printed(text: str, value: float) -> bool:
    """Whether a value rounds to a printed number: half a unit in its last digit."""
    mantissa, _, exponent = text.lstrip("+").partition("e")
    digits = len(mantissa.partition(".")[2])
    half = 0.5 * 10.0 ** (int(exponent or 0) - digits)
    return abs(value - float(text)) <= half * (1 + 1e-9)


def over_time(
    rules: str, wavelength: float, t: float, tissue: str, effects: tuple[str, str], alpha: float = 1.5
):
    """Limits [J/m2] just before and just after a time. After: the float above, where one row alone holds."""
    below = limit(rules, wavelength, JUST(t, 0), alpha, tissue, effects[0])
    return below, limit(rules, wavelength, JUST(t, math.inf), alpha, tissue, effects[1])


TT, TP, PP = ("thermal", "thermal"), ("thermal", "photochemical"), ("photochemical", "photochemical")

# (rule sets, wavelength nm, break s, tissue, effects, subtense mrad, below, above, step %); "" where
# only the step is given.
ALL, FAMILY_2013 = RULES, (ICNIRP, IEC, ANSI)
TIME_BREAKS = [
    # 2006/25/EC continuity
    (ALL, 250.0, 1e-9, "cornea", TP, 1.5, "30", "30", "0"),
    (ALL, 350.0, 1e-9, "lens", TT, 1.5, "30", "31.49", "+5.0"),
    (ALL, 350.0, 10.0, "lens", TP, 1.5, "9958", "1e4", "+0.4"),
    ((EU,), 550.0, 1e-11, "retina", TT, 1.5, "1.5e-4", "1.518e-4", "+1.2"),
    ((EU,), 550.0, 1e-9, "retina", TT, 1.5, "4.80e-3", "5e-3", "+4.1"),
    ((EU,), 550.0, 1.8e-5, "retina", TT, 1.5, "5e-3", "4.974e-3", "-0.5"),
    ((EU,), 800.0, 1e-11, "retina", TT, 1.5, "", "", "+1.2"),
    ((EU,), 800.0, 1e-9, "retina", TT, 1.5, "", "", "+4.1"),
    ((EU,), 800.0, 1.8e-5, "retina", TT, 1.5, "", "", "-0.5"),
    (ALL, 550.0, 10.0, "retina", TT, 1.5, "101.2", "100", "-1.2"),
    (ALL, 800.0, 10.0, "retina", TT, 1.5, "", "", "-1.2"),
    (ALL, 1064.0, 10.0, "retina", TT, 1.5, "", "", "-1.2"),
    ((EU,), 1064.0, 1e-11, "retina", TT, 1.5, "1.5e-3", "1.518e-3", "+1.2"),
    ((EU,), 1064.0, 1e-9, "retina", TT, 1.5, "4.80e-2", "5e-2", "+4.1"),
    ((EU,), 1064.0, 5e-5, "retina", TT, 1.5, "5e-2", "5.351e-2", "+7.0"),
    # 90 t^0.75 against 18 x 5 t^0.75 (ANSI: 90 on both sides)
    (ALL, 1064.0, 10.0, "retina", TT, 30.0, "", "", "0"),
    (ALL, 550.0, 10.0, "retina", TT, 30.0, "", "", "0"),
    (ALL, 1450.0, 1e-3, "cornea", TT, 1.5, "1e3", "995.8", "-0.4"),
    (ALL, 2000.0, 1e-3, "cornea", TT, 1.5, "1e3", "995.8", "-0.4"),
    (ALL, 1450.0, 10.0, "cornea", TT, 1.5, "9958", "1e4", "+0.4"),
    (ALL, 10600.0, 10.0, "cornea", TT, 1.5, "9958", "1e4", "+0.4"),
    (ALL, 1550.0, 10.0, "cornea", TT, 1.5, "1e4", "1e4", "0"),
    (ALL, 10600.0, 1e-7, "cornea", TT, 1.5, "100", "99.58", "-0.4"),
    (ALL, 10600.0, 1e-9, "cornea", TT, 1.5, "100", "100", "0"),
    (ALL, 1450.0, 1e-9, "cornea", TT, 1.5, "1000", "1000", "0"),
    (ALL, 1550.0, 1e-9, "cornea", TT, 1.5, "10000", "10000", "0"),
    (ALL, 550.0, 1e-9, "skin", TT, 1.5, "200", "200", "0"),
    (ALL, 550.0, 1e-7, "skin", TT, 1.5, "200", "195.6", "-2.2"),
    (ALL, 550.0, 10.0, "skin", TT, 1.5, "1.956e4", "2e4", "+2.2"),
    (ALL, 800.0, 1e-7, "skin", TT, 1.5, "", "", "-2.2"),
    (ALL, 800.0, 10.0, "skin", TT, 1.5, "", "", "+2.2"),
    (ALL, 430.0, 100.0, "retina", PP, 1.5, "100", "100", "0"),
    (ALL, 550.0, 100.0, "retina", PP, 1.5, "10000", "10000", "0"),
    # ICNIRP 2013 continuity
    (FAMILY_2013, 550.0, 1e-11, "retina", TT, 1.5, "1e-3", "2e-3", "+100"),
    (FAMILY_2013, 800.0, 1e-11, "retina", TT, 1.5, "", "", "+100"),
    (FAMILY_2013, 550.0, 5e-6, "retina", TT, 1.5, "2e-3", "1.903e-3", "-4.8"),
    (FAMILY_2013, 800.0, 5e-6, "retina", TT, 1.5, "", "", "-4.8"),
    (FAMILY_2013, 1064.0, 1e-11, "retina", TT, 1.5, "1e-2", "2e-2", "+100"),
    (FAMILY_2013, 1064.0, 1.3e-5, "retina", TT, 1.5, "2e-2", "1.948e-2", "-2.6"),
    # ANSI: 50 W/m2 x 10 s = 500 against 90 x 10^0.75 = 506
    ((ANSI,), 1064.0, 10.0, "retina", TT, 1.5, "506", "500", "-1.2"),
    # IEC: 1e4 J/m2 meets 10 W/m2 x 1000 s
    ((IEC,), 350.0, 1e3, "lens", PP, 1.5, "10000", "10000", "0"),
    ((IEC, ANSI), 350.0, 1e3, "skin", PP, 1.5, "10000", "10000", "0"),
    # the second limit below 1400 nm steps as the skin, C_A = 5 (ANSI: as 1400-1500 nm)
    ((ICNIRP, IEC), 1300.0, 1e-7, "anterior", TT, 1.5, "1000", "978", "-2.2"),
    ((ICNIRP, IEC), 1300.0, 10.0, "anterior", TT, 1.5, "9.78e4", "1e5", "+2.2"),
    ((ANSI,), 1300.0, 1e-3, "anterior", TT, 1.5, "1e3", "995.8", "-0.4"),
    ((ANSI,), 1300.0, 10.0, "anterior", TT, 1.5, "9958", "1e4", "+0.4"),
]


@pytest.mark.parametrize("case", TIME_BREAKS, ids=lambda c: f"{c[1]:g}nm-{c[2]:g}s-{c[3]}-{c[5]:g}-{c[0][0]}")
def test_steps_in_time(case: tuple) -> None:
    sets, wavelength, t, tissue, effects, alpha, below_text, above_text, step = case
    for rules in sets:
        below, above = over_time(rules, wavelength, t, tissue, effects, alpha)
        assert printed(step, percent(below, above)), (rules, below, above)
        assert not below_text or printed(below_text, below), (rules, below)
        assert not above_text or printed(above_text, above), (rules, above)


#: H of the steps 303-314 nm, the printed end of the thermal row and the exact crossing (H/5600)^4 [s].
STEPS = {
    303: (40, 2.6e-9, "2.60e-9"), 304: (60, 1.3e-8, "1.32e-8"), 305: (100, 1e-7, "1.02e-7"),
    306: (160, 6.7e-7, "6.66e-7"), 307: (250, 4e-6, "3.97e-6"), 308: (400, 2.6e-5, "2.60e-5"),
    309: (630, 1.6e-4, "1.60e-4"), 310: (1e3, 1e-3, "1.02e-3"), 311: (1.6e3, 6.7e-3, "6.66e-3"),
    312: (2.5e3, 4e-2, "3.97e-2"), 313: (4e3, 0.26, "0.260"), 314: (6.3e3, 1.6, "1.60"),
}  # fmt: skip


@pytest.mark.parametrize("nm", STEPS)
def test_ultraviolet_steps_meet_their_thermal_limit(nm: int) -> None:
    """2006/25/EC Table 2.2 (read): within 0.43 % at every printed time; 5600 t^0.25 crosses H where said."""
    h, end, crossing = STEPS[nm]
    below, above = over_time(EU, nm + 0.5, end, "cornea/lens", TP)
    assert above == pytest.approx(h, rel=1e-12, abs=0)
    assert abs(percent(below, above)) <= 0.435
    assert printed(crossing, (above / (below / JUST(end, 0) ** 0.25)) ** 4)
    for rules in (ICNIRP, ANSI):
        # Both limits side by side, so that the lower one crosses at the same time. From memory.
        assert limit(rules, nm, end, 1.5, "cornea/lens", "photochemical") == pytest.approx(
            h, rel=1e-12, abs=0
        )
        thermal = limit(rules, nm, float(crossing), 1.5, "cornea/lens", "thermal")
        assert thermal == pytest.approx(h, rel=1.5e-3)


def test_the_worst_of_the_ultraviolet_times() -> None:
    """305 nm: 5600 x (1e-7)^0.25 = 99.58 against 100, 0.42 %."""
    steps = [abs(percent(*over_time(EU, nm, s[1], "cornea/lens", TP))) for nm, s in STEPS.items()]
    assert printed("0.42", max(steps))


def test_whole_nanometre_steps_against_the_formula() -> None:
    """10^(0.2(x - 295)): within 5.2 %, 304 nm the largest (60 against 63.1)."""
    off = {nm: abs(percent(10 ** (0.2 * (nm - 295)), h)) for nm, (h, _, _) in STEPS.items()}
    assert max(off, key=off.__getitem__) == 304
    # 60 against 63.1 is 4.9 % of 63.1 and 5.2 % of 60
    assert printed("5.2", percent(60, factor(IEC, "C2", 304.0)))
    assert printed("63.1", factor(IEC, "C2", 304.0))


def test_iec_ultraviolet_joins() -> None:
    """IEC Table 9 (from memory): C2(302.5) = 31.6 against 30, +5.4 %; C1 = C2 at T1 with a ratio of 0.996."""
    below = limit(IEC, JUST(302.5, 0), 1.0, 1.5, "cornea", "photochemical")
    above = limit(IEC, 302.5, 1.0, 1.5, "cornea/lens", "photochemical")
    assert (printed("30", below), printed("31.6", above), printed("+5.4", percent(below, above))) == (
        True,
    ) * 3
    for nm in (304.0, 308.0, 312.0):
        t1 = factor(IEC, "T1", nm)
        thermal = limit(IEC, nm, t1 * (1 - 1e-9), 1.5, "cornea/lens", "thermal")
        blue = limit(IEC, nm, t1 * (1 + 1e-9), 1.5, "cornea/lens", "photochemical")
        assert printed("0.996", thermal / blue)


# (rule sets, wavelength nm, time s, below, above, step %): retina thermal, the float below against above.
WAVELENGTH_BREAKS = [
    # The row changes by 10 while C_A gives 5: an inherent step
    ((EU,), 1050.0, 1e-6, "2.51e-2", "5e-2", "+100"),
    ((EU,), 1050.0, 1e-3, "", "", "-0.2"),  # 18 x 5.01 = 90.2 against 90
    (FAMILY_2013, 1050.0, 1e-6, "1.00e-2", "2.00e-2", "+100"),
    (FAMILY_2013, 1050.0, 1e-3, "", "", "-0.2"),
    (RULES, 1050.0, 100.0, "", "", "-0.2"),
    (RULES, 700.0, 1e-3, "", "", "0.0"),
    (RULES, 700.0, 100.0, "", "", "0.0"),
]


@pytest.mark.parametrize("case", WAVELENGTH_BREAKS, ids=lambda c: f"{c[1]:g}nm-{c[2]:g}s-{c[0][0]}")
def test_steps_in_wavelength(case: tuple) -> None:
    sets, wavelength, t, below_text, above_text, step = case
    for rules in sets:
        below = limit(rules, JUST(wavelength, 0), t)
        above = limit(rules, JUST(wavelength, math.inf), t)
        assert printed(step, percent(below, above)), (rules, below, above)
        assert not below_text or printed(below_text, below), (rules, below)
        assert not above_text or printed(above_text, above), (rules, above)


def test_the_coefficients_at_1050_nm() -> None:
    """18 x 5.01 = 90.2 against 90."""
    for rules, name in ((ICNIRP, "C_A"), (EU, "C_A"), (IEC, "C4"), (ANSI, "C_A")):
        c = factor(rules, name, JUST(1050.0, 0))
        assert (printed("5.01", c), printed("90.2", 18 * c)) == (True, True)


# (rule set, factor, break, below, above, step %)
FACTOR_BREAKS = [
    *((r, "C4" if r == IEC else "C_A", 1050.0, "5.012", "5.0", "-0.2") for r in RULES),
    (EU, "C_C", 1200.0, "7.943", "8.0", "+0.7"),
    *((r, "C7" if r == IEC else "C_C", 1200.0, "7.943", "8.010", "+0.8") for r in FAMILY_2013),
    *((r, "T2", 1.5, "10", "10", "0") for r in RULES),
    *((r, "T2", 100.0, "100", "100", "0") for r in RULES),
    *((r, "gamma_ph" if r == IEC else "gamma", 100.0, "11", "11", "0") for r in RULES),
    *((r, "gamma_ph" if r == IEC else "gamma", 1e4, "110", "110", "0") for r in RULES),
    *((r, "alpha_max", 625e-6, "5", "5", "0") for r in FAMILY_2013),
    *((r, "alpha_max", 0.25, "100", "100", "0") for r in FAMILY_2013),
]


@pytest.mark.parametrize("case", FACTOR_BREAKS, ids=lambda c: f"{c[1]}-{c[2]:g}-{c[0]}")
def test_steps_of_the_factors(case: tuple) -> None:
    rules, name, x, below_text, above_text, step = case
    below, above = factor(rules, name, JUST(x, 0)), factor(rules, name, JUST(x, math.inf))
    assert (printed(below_text, below), printed(above_text, above)) == (True, True), (below, above)
    assert printed(step, percent(below, above))


@pytest.mark.parametrize("rules", RULES)
def test_the_subtense_factor_meets_at_alpha_max(rules: str) -> None:
    """C_E at 100 mrad: 66.67 on both sides (all sets, t >= 0.25 s); 1 at 1.5 mrad."""
    engine = compiled(rules)
    time = np.array([1.0, 1.0, 1.0])
    below, at, above = engine.subtense_factor(np.array([JUST(100.0, 0), 100.0, JUST(100.0, 101)]), time)
    assert all(printed("66.67", float(x)) for x in (below, at, above))
    assert engine.subtense_factor(np.array([1.5, JUST(1.5, 2)]), time[:2]) == pytest.approx([1.0, 1.0])


@pytest.mark.parametrize("rules", [ICNIRP, IEC, ANSI])
def test_c_c_grows_without_bound(rules: str) -> None:
    """C_C at 1250 / 1310 / 1350 / 1400 nm: 9 / 259 / 1.0e4 / 1.0e6, which is why a second limit is needed."""
    name = "C7" if rules == IEC else "C_C"
    for nm, text in ((1250.0, "9"), (1310.0, "259"), (1350.0, "1.0e4"), (1400.0, "1.0e6")):
        assert printed(text, factor(rules, name, nm))


def test_exact_crossings_of_the_2013_family() -> None:
    """2e-3 = 18 t^0.75 at 5.34 us; 2e-2 = 90 t^0.75 at 13.46 us."""
    for rules in FAMILY_2013:
        for nm, shorter, longer, text in ((550.0, 1e-7, 1e-3, "5.34"), (1064.0, 1e-7, 1e-3, "13.46")):
            flat, rising = limit(rules, nm, shorter), limit(rules, nm, longer) / longer**0.75
            assert printed(text, 1e6 * (flat / rising) ** (4 / 3))


def test_blue_light_crossing() -> None:
    """100 C_B reaches 10 W/m2 after 10 C_B s, which is T1; H against the radiance form is 5 % rounding."""
    for rules in (ICNIRP, EU, ANSI):
        for nm in (455.0, 470.0, 490.0):
            blue = limit(rules, nm, 50.0, 1.5, "retina", "photochemical")
            thermal = limit(rules, nm, 50.0, 1.5, "retina", "thermal") / 50.0
            assert blue / thermal == pytest.approx(factor(rules, "T1", nm), rel=1e-12, abs=0)
    # 100 / (pi/4 x 0.011^2) = 1.05e6 J/(m2 sr) against 1e6
    radiance = limit(ICNIRP, 430.0, 50.0, 1.5, "retina", "photochemical") / (math.pi / 4 * 0.011**2)
    assert printed("1.05e6", radiance)


@pytest.mark.parametrize("rules", RULES)
def test_extended_rows_meet_at_t2(rules: str) -> None:
    """18 t^0.75 = 18 T2^-0.25 t at t = T2 (ANSI 1050-1400 nm: 90): 0 %."""
    for nm in (550.0, 800.0, 1064.0):
        t2 = factor(rules, "T2", 30.0)
        below, above = limit(rules, nm, t2 * (1 - 1e-12), 30.0), limit(rules, nm, t2 * (1 + 1e-12), 30.0)
        assert percent(below, above) == pytest.approx(0.0, abs=1e-8)


# (rule sets, wavelength nm, break s, tissue, below mm, above mm, step %)
APERTURE_BREAKS = [
    ((ICNIRP,), 350.0, 0.35, "lens", "1", "1.012", "+1.2"),
    ((ICNIRP, IEC), 1e4, 0.35, "cornea", "1", "1.012", "+1.2"),
    ((EU, ANSI), 350.0, 0.3, "lens", "1", "0.955", "-4.5"),
    ((EU, ANSI), 1e4, 0.3, "cornea", "1", "0.955", "-4.5"),
    ((ICNIRP, EU, ANSI), 350.0, 10.0, "lens", "3.557", "3.5", "-1.6"),
    (RULES, 1e4, 10.0, "cornea", "3.557", "3.5", "-1.6"),
    ((ANSI,), 1300.0, 0.3, "anterior", "1", "0.955", "-4.5"),
    ((ANSI,), 1300.0, 10.0, "anterior", "3.557", "3.5", "-1.6"),
]


@pytest.mark.parametrize("case", APERTURE_BREAKS, ids=lambda c: f"{c[1]:g}nm-{c[2]:g}s-{c[3]}-{c[0][0]}")
def test_steps_of_the_apertures(case: tuple) -> None:
    sets, wavelength, t, tissue, below_text, above_text, step = case
    for rules in sets:
        below, above = (aperture_mm(rules, wavelength, x, tissue) for x in (JUST(t, 0), t))
        assert (printed(below_text, below), printed(above_text, above)) == (True, True), (rules, below, above)
        assert printed(step, percent(below, above)), rules


def test_the_aperture_is_1_mm_at_0_339_s() -> None:
    """1.5 t^0.375 = 1 mm at 0.339 s: between the two printed breaks, 0.3 s and 0.35 s."""
    middle = aperture_mm(ICNIRP, 1e4, 1.0, "cornea")
    assert printed("0.339", (1 / middle) ** (8 / 3))


@pytest.mark.parametrize("rules", [ICNIRP, IEC, ANSI])
def test_steps_of_the_pulse_factor(rules: str) -> None:
    """5 N^-0.25 at 600: 1 to 1.0103, counted as 1; N^-0.25 at 40: 0.3976 to 0.4, +0.6 %; at 625: 0.2, 0 %."""
    repetition = compiled(rules).repetition

    def value(row: str, n: float) -> float:
        return float(repetition(np.array([named(repetition.rows, row)]), np.array([n]))[0])

    short = "short-small" if rules == ANSI else "short"
    row = repetition.rows[named(repetition.rows, f"{short}-many")]
    assert printed("1.0103", row.coefficient * 600**row.count_power)
    assert printed("+1", percent(1, row.coefficient * 600**row.count_power))
    assert value(f"{short}-few", 600) == value(f"{short}-many", JUST(600, 601)) == 1.0
    few, many = value("long-mid-few", 40), value("long-mid-many", JUST(40, 41))
    assert (printed("0.3976", few), printed("0.4", many), printed("+0.6", percent(few, many))) == (True,) * 3
    few, many = value("long-wide-few", 625), value("long-wide-many", JUST(625, 626))
    assert (printed("0.2", few), printed("0.2", many), printed("0", percent(few, many))) == (True,) * 3
