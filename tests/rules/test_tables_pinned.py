"""Every cell of every table against numbers typed a second time; row counts and column sums.

`printed_limits` and `printed_tables` were typed by hand from the published numbers, not copied from data/.
Counts and sums below were worked out from the published tables; the derivation stands beside each.
"""

from __future__ import annotations

import math
from collections import Counter

import pytest

from tests.rules.engine import ANSI, EU, ICNIRP, IEC, RULES, number, table
from tests.rules.printed_limits import LIMITS, Printed
from tests.rules.printed_tables import ADDITIVITY, APERTURES, DURATIONS, FACTOR_SOURCE, FACTORS, REPETITION

# Limits. Infrared block (1400 nm-1 mm): 3 + 2 + 3 + 3 rows below 10 s, 1 beyond = 12.
# Ultraviolet, whole-nanometre sets: 3 sub-ns, 180-303, 12 steps, second limit, 315-400 twice = 19;
# 2006/25/EC: 3 + (1 + 12 x 2 + 1) below 10 s + (1 + 12 + 1) beyond = 43; IEC: 3 + 1 + 3 + 3 = 10.
# Retina below 10 s: 3 bands x 3 times = 9 (2006/25/EC: x 4 = 12); beyond: 2 x 3 = 6 (ANSI 3 x 3 = 9);
# blue light 2; anterior 4 (none in 2006/25/EC). Skin 400-1400 nm: 4 + 4; 2006/25/EC 2 + 3; ANSI 4.
COUNTS = {
    # eye 19 + 9 + 6 + 2 + 4 + 12 = 52, skin 19 + 8 + 12 = 39.
    # factors 8 spectral, alpha_min 1, alpha_max 3, T2 3, gamma 3, T1 1, T_i 6 = 25.
    # apertures 3 + 3 + retina, far, anterior + skin 2 = 11; repetition 1 + 3 + 5 = 9.
    ICNIRP: {"limits": 91, "factors": 25, "apertures": 11, "durations": 9, "repetition": 9},
    # eye 43 + 12 + 6 + 2 + 12 = 75, skin 43 + 5 + 12 = 60.
    # factors: alpha_max 1 instead of 3, T1 3 instead of 1, T_min one band more = 26.
    # apertures 3 + 3 + retina, far + skin 1 = 9; repetition 1.
    EU: {"limits": 135, "factors": 26, "apertures": 9, "durations": 9, "repetition": 1},
    # eye 10 + 9 + 6 + 2 + 4 + 12 = 43, skin 10 + 8 + 12 = 30.
    # factors 25 + C1 + C2 = 27 (T1 is another T1); apertures 1 + 3 + retina, far, anterior + 2 = 9.
    IEC: {"limits": 73, "factors": 27, "apertures": 9, "durations": 9, "repetition": 9},
    # eye 19 + 9 + 9 + 2 + 4 + 12 = 55, skin 20 (315-400 splits at 1000 s) + 4 + 12 = 36.
    # apertures 3 + 3 + retina, far + anterior 3 + skin 2 = 13; repetition 1 + 3 + 2 + 5 = 11.
    ANSI: {"limits": 91, "factors": 25, "apertures": 13, "durations": 9, "repetition": 11},
}

# Sums of the coefficient column, H rows [J/m2] and E rows [W/m2] apart.
# Steps 303-314 nm: 40+60+100+160+250+400+630+1000+1600+2500+4000+6300 = 17 040.
# Infrared: H 2 x (1000 + 5600) + 1e4 + 100 + 5600 = 28 900; E 1e12 + 1e13 + 1e12 + 1e11 + 1000.
# Skin 400-1400: H 200 + 11 000 = 11 200; E 2e11 + 2000.
# Retina 2013: H 2 x 18.003 + 90.03 = 126.036; long: H 18 + 18, E 10 + 18 + 10 + 18 = 56; blue H 100, E 1.
# Stepped ultraviolet: H 30 + 17 040 + 5600 + 5600 + 1e4 = 38 270; E 3 x 3e10.
IR_H, IR_E = 28_900, 12.1e12 + 1000
SKIN_H, SKIN_E = 11_200, 2e11 + 2000
STEPPED_H, SUBNS_E = 38_270, 9e10
COEFFICIENT_SUMS = {
    # H 2 x 38 270 + 126.036 + 36 + 100 + 3 x 11 200 + 2 x 28 900 = 168 202.036
    ICNIRP: (
        2 * STEPPED_H + 126.036 + 36 + 100 + 3 * SKIN_H + 2 * IR_H,
        2 * SUBNS_E + 57 + 3 * SKIN_E + 2 * IR_E,
    ),
    # Ultraviolet: 2 x 30 + 2 x 17 040 + 13 x 5600 + 1e4 = 116 940.
    # Retina: 2 x (1.5e-4 + 2.7e4 + 5e-3 + 18) + (1.5e-3 + 2.7e5 + 5e-2 + 90) = 324 126.0618.
    # Skin 400-1400: H 11 200, E 2 x 2e11 + 2000.
    EU: (
        2 * 116_940 + 324_126.0618 + 36 + 100 + SKIN_H + 2 * IR_H,
        2 * SUBNS_E + 57 + SKIN_E + 2e11 + 2 * IR_E,
    ),
    # Ultraviolet: H 30 + C1 and C2 rows with coefficient 1 (four) + 1e4 = 10 034; E 9e10 + 10.
    IEC: (
        2 * 10_034 + 126.036 + 36 + 100 + 3 * SKIN_H + 2 * IR_H,
        2 * (SUBNS_E + 10) + 57 + 3 * SKIN_E + 2 * IR_E,
    ),
    # Long: H 18 + 18 + 90 = 126, E 28 + 28 + 140 = 196, blue H 100, E 1; stand-in H 6600, E 1e12 + 1000;
    # skin ultraviolet: H as the eye, E 10 more; skin 400-1400 once.
    ANSI: (
        2 * STEPPED_H + 126.036 + 126 + 100 + 6_600 + SKIN_H + 2 * IR_H,
        2 * SUBNS_E + 10 + 197 + 1e12 + 1000 + SKIN_E + 2 * IR_E,
    ),
}

# Sums of the wavelength columns [nm].
# Infrared: from 4 x 1400 + 2 x 1500 + 3 x 1800 + 3 x 2600 = 21 800;
# to 3 x 1500 + 2 x 1800 + 3 x 2600 + 4 x 1e6 = 4 015 900.
# Steps: from 303..314 = 3702, to 304..315 = 3714.
# Stepped ultraviolet: from 180+303+315+180+3702+303+315+315 = 5613; to 303+315+400+303+3714+315+400+400
# = 6150. Retina 2013: from 3 x (400+700+1050) = 6450, to 3 x (700+1050+1400) = 9450; long: from 3 x 1100,
# to 3 x 2100; blue 800, 1200.
WAVELENGTH_SUMS = {
    # anterior 4 x 1250, 4 x 1400; skin 4 x (400 + 700), 4 x (700 + 1400)
    ICNIRP: (
        2 * 5613 + 6450 + 3300 + 800 + 5000 + 4400 + 2 * 21_800,
        2 * 6150 + 9450 + 6300 + 1200 + 5600 + 8400 + 2 * 4_015_900,
    ),
    # Ultraviolet: sub-ns 798, 1018; 180-303 twice; 315-400 twice; steps three times:
    # from 798 + 360 + 630 + 3 x 3702 = 12 894; to 1018 + 606 + 800 + 3 x 3714 = 13 566.
    # Retina x 4: 8600, 12 600; skin 400 + 700 + 3 x 400 = 2300, 700 + 1400 + 3 x 1400 = 6300.
    EU: (
        2 * 12_894 + 8600 + 3300 + 800 + 2300 + 2 * 21_800,
        2 * 13_566 + 12_600 + 6300 + 1200 + 6300 + 2 * 4_015_900,
    ),
    # Ultraviolet: from 180 + 302.5 + 315 + 180 + 3 x 302.5 + 3 x 315 = 2830;
    # to 302.5 + 315 + 400 + 302.5 + 3 x 315 + 3 x 400 = 3465.
    IEC: (
        2 * 2830 + 6450 + 3300 + 800 + 5000 + 4400 + 2 * 21_800,
        2 * 3465 + 9450 + 6300 + 1200 + 5600 + 8400 + 2 * 4_015_900,
    ),
    # Long 3 x (400 + 700 + 1050), 3 x (700 + 1050 + 1400); anterior 4 x 1200, 4 x 1400;
    # skin ultraviolet one 315-400 row more; skin 4 x 400, 4 x 1400.
    ANSI: (
        2 * 5613 + 315 + 6450 + 6450 + 800 + 4800 + 1600 + 2 * 21_800,
        2 * 6150 + 400 + 9450 + 9450 + 1200 + 5600 + 5600 + 2 * 4_015_900,
    ),
}

# Sums of the numeric time columns [s], break times T1 and T2 left out. Only rows from 10 s on carry weight:
# their number of starts (10, 100, 1000 s) and of ends (30 000, 1000, 100, 10 s) is counted below; the sums
# of the times below 1 s follow from the bands. `ends` counts rows by their last instant.
TIME_FROM = {
    # 315-400 10 s x 2, long 4 x 10, blue 10 + 100, anterior, skin 2, infrared 2 = 11 x 10 + 100
    ICNIRP: {10: 12, 100: 1},
    # ultraviolet 14 x 2, long 4, blue 1 (+100), skin 1, infrared 2 = 36
    EU: {10: 36, 100: 1, 1.6: 2},
    # 302.5-315 and 315-400: 2 x 2 (+ 2 x 1000), long 4, blue 1, anterior 1, skin 2, infrared 2 = 14
    IEC: {10: 14, 100: 1, 1000: 2},
    # 315-400 2 (+1000 skin), long 6, blue 1, anterior 1, skin 1, infrared 2 = 13
    ANSI: {10: 13, 100: 1, 1000: 1},
}
TIME_TO = {
    # 30 000: 180-303 and 12 steps and 315-400 = 14 x 2, long 4, blue 1, anterior 1, skin 2, infrared 2 = 38
    # 10: second limit and 315-400 = 2 x 2, retina 3, anterior 1, skin 2, infrared 4 x 2 = 18
    ICNIRP: {3e4: 38, 10: 18, 100: 1},
    # 30 000: 14 x 2, long 4, blue 1, skin 1, infrared 2 = 36; 10: 14 x 2, retina 3, skin 1, infrared 8 = 40
    EU: {3e4: 36, 10: 40, 100: 1, 1.6: 2},
    # 30 000: (180-302.5, C2, 315-400) x 2, long 4, blue 1, anterior 1, skin 2, infrared 2 = 16
    # 10: (C2, C1) x 2, retina 3, anterior 1, skin 2, infrared 8 = 18
    IEC: {3e4: 16, 10: 18, 100: 1, 1000: 2},
    # 30 000: 14 x 2, long 6, blue 1, anterior 1, skin 1, infrared 2 = 39
    # 10: 2 x 2, retina 3, anterior 1, skin 1, infrared 8 = 17
    ANSI: {3e4: 39, 10: 17, 100: 1, 1000: 1},
}


def column(rules: str, name: str, **only: str) -> list[float]:
    rows = [r for r in table(rules, "limits") if all(r[k] == v for k, v in only.items())]
    return [x for r in rows if isinstance(x := number(r[name]), float)]


def differences(found: list, printed: list) -> tuple[list, list]:
    """Rows that only one side has; both empty where the table is as printed."""
    a, b = Counter(found), Counter(printed)
    return sorted((a - b).elements(), key=repr), sorted((b - a).elements(), key=repr)


@pytest.mark.parametrize("rules", RULES)
def test_limits_cell_by_cell(rules: str) -> None:
    found = [
        Printed(
            r["tissue"], r["effect"],
            (float(r["wavelength_from_nm"]), float(r["wavelength_to_nm"])),
            (number(r["time_from_s"]), number(r["time_to_s"])),
            r["quantity"], float(r["coefficient"]), float(r["time_power"]),
            tuple(sorted(r["factors"].split())),
            (number(r["subtense_from_mrad"]), number(r["subtense_to_mrad"])),
            number(r["cap"]), r["source"], r["known"],
        )
        for r in table(rules, "limits")
    ]  # fmt: skip
    assert differences(found, LIMITS[rules]) == ([], [])
    assert all(r["target"] == ("skin" if r["tissue"] == "skin" else "eye") for r in table(rules, "limits"))


@pytest.mark.parametrize("rules", RULES)
def test_factors_cell_by_cell(rules: str) -> None:
    rows = table(rules, "factors")
    numbers = ("from", "to", "offset", "coefficient", "slope", "origin", "per", "power")
    found = [(r["factor"], r["unit"], r["variable"], *(number(r[n]) for n in numbers)) for r in rows]
    printed = FACTORS[rules]
    if rules == IEC:
        # C4 = 1 below 700 nm is a convenience: the standard prints C4 from 700 nm, no row uses it below.
        assert not any("C4" in r.factors for r in LIMITS[IEC] if r.wavelength[0] < 700)
    assert differences(found, printed) == ([], [])
    assert {(r["source"], r["known"]) for r in rows} == {FACTOR_SOURCE[rules]}


@pytest.mark.parametrize("rules", RULES)
def test_apertures_cell_by_cell(rules: str) -> None:
    rows = table(rules, "apertures")
    numbers = (
        "wavelength_from_nm", "wavelength_to_nm", "time_from_s", "time_to_s", "coefficient_mm", "time_power",
    )  # fmt: skip
    found = [(r["target"], r["tissue"], *(number(r[n]) for n in numbers)) for r in rows]
    assert differences(found, APERTURES[rules]) == ([], [])
    for r in rows:
        # 2006/25/EC: only the 3.5 mm of Table 2.3 (t >= 10 s) is from memory.
        from_memory = rules != EU or (r["target"] == "eye" and r["time_from_s"] == "10")
        assert r["known"] == ("memory" if from_memory else "read"), r["row"]


@pytest.mark.parametrize("rules", RULES)
def test_durations_cell_by_cell(rules: str) -> None:
    rows = table(rules, "durations")
    numbers = ("wavelength_from_nm", "wavelength_to_nm", "duration_s")
    assert [(r["kind"], *(number(r[n]) for n in numbers)) for r in rows] == DURATIONS[rules]
    for r in rows:
        # US practice (10 s and 600 s, every ANSI default) is from memory, the rest read in TROS part 2, 4.1.
        us = number(r["duration_s"]) in (10.0, 600.0) or (rules == ANSI and r["kind"] == "default")
        assert (r["source"], r["known"]) == ((ANSI, "memory") if us else ("tros-laser-2", "read")), r["row"]


@pytest.mark.parametrize("rules", RULES)
def test_repetition_cell_by_cell(rules: str) -> None:
    rows = table(rules, "repetition")
    numbers = (
        "exposure_from_s", "exposure_to_s", "subtense_from_mrad", "subtense_to_mrad", "count_from",
        "count_to", "coefficient", "count_power", "floor",
    )  # fmt: skip
    words = ("target", "tissue", "effect", "pulse")
    found = [(*(r[w] for w in words), *(number(r[n]) for n in numbers)) for r in rows]
    assert differences(found, REPETITION[rules]) == ([], [])
    assert {(r["source"], r["known"]) for r in rows} == {FACTOR_SOURCE[rules]}


def test_additivity_cell_by_cell() -> None:
    found = {
        (
            (float(r["band_from_nm"]), float(r["band_to_nm"])),
            (float(r["with_from_nm"]), float(r["with_to_nm"])),
        ): (r["eye"] == "yes", r["skin"] == "yes")
        for r in table(ICNIRP, "additivity")
    }
    assert found == ADDITIVITY
    assert {(r["source"], r["known"]) for r in table(ICNIRP, "additivity")} == {("bgi-832", "read")}


@pytest.mark.parametrize("rules", RULES)
def test_row_counts(rules: str) -> None:
    assert {name: len(table(rules, name)) for name in COUNTS[rules]} == COUNTS[rules]
    assert len(table(rules, "additivity")) == 10  # 4 bands: 4 with themselves, 6 pairs


@pytest.mark.parametrize("rules", RULES)
def test_coefficient_sums(rules: str) -> None:
    h, e = COEFFICIENT_SUMS[rules]
    assert math.fsum(column(rules, "coefficient", quantity="H")) == pytest.approx(h, rel=1e-13, abs=0)
    assert math.fsum(column(rules, "coefficient", quantity="E")) == pytest.approx(e, rel=1e-15)


@pytest.mark.parametrize("rules", RULES)
def test_wavelength_sums(rules: str) -> None:
    found = tuple(math.fsum(column(rules, f"wavelength_{end}_nm")) for end in ("from", "to"))
    assert found == WAVELENGTH_SUMS[rules]


@pytest.mark.parametrize("rules", RULES)
def test_time_sums(rules: str) -> None:
    for end, counts in (("from", TIME_FROM[rules]), ("to", TIME_TO[rules])):
        late = [t for t in column(rules, f"time_{end}_s") if t >= 1]
        assert math.fsum(late) == math.fsum(t * n for t, n in counts.items())
        early = [t for t in column(rules, f"time_{end}_s") if t < 1]
        name = 0 if end == "from" else 1
        printed = [r.time[name] for r in LIMITS[rules] if not isinstance(r.time[name], str)]
        assert math.fsum(map(math.log10, early)) == pytest.approx(
            math.fsum(math.log10(t) for t in printed if t < 1), rel=1e-13
        )


def test_the_skin_aperture_of_2006_25_names_its_table() -> None:
    """2006/25/EC Annex II Table 2.4 (read) is the skin table."""
    row = next(r for r in table(EU, "apertures") if r["target"] == "skin")
    assert "2.4" in row["locator"]


def test_rows_of_2006_25_name_their_table() -> None:
    """Annex II: 2.2 eye below 10 s, 2.3 eye from 10 s, 2.4 skin, 2.5 factors, 2.6 repetition."""
    for r in table(EU, "limits"):
        late = r["time_from_s"] in ("10", "100", "T2")
        named = "2.4" if r["target"] == "skin" else "2.3" if late else "2.2"
        assert named in r["locator"], r["row"]
    for r in table(EU, "factors"):
        assert ("2.6" if r["factor"] == "T_min" else "2.5") in r["locator"], r["row"]
    assert all("2.6" in r["locator"] for r in table(EU, "repetition"))
