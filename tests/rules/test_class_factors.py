"""Every factor, repetition, measurement and time-base row of the class schemes hit, values by hand.

Sources: IEC 60825-1:2014 4.3, Tables 2, 9 and 10; 21 CFR 1040.10(d) Table IV and (e); all from memory.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from tests.rules.class_engine import IEC, SCHEMES, US, compiled, factor, measured, table
from tests.rules.test_rows_factors import LARGE, LONG, SHORT, before, grouping, size_2013, spectral

EXACT = 1e-12
JUST = math.nextafter

#: 21 CFR 1040.10(d) Table IV. Bands are printed with their upper end; both formulas meet at 302.4 nm.
K1 = {
    "k1-180": [(180, 1), (250, 1), (before(302.4), 1)],
    # (307.4 - 302.4)/5 = 1; (312.4 - 302.4)/5 = 2; 12.6/5 = 2.52
    "k1-302": [(302.4, 1), (307.4, 10), (312.4, 100), (before(315), 10**2.52)],
    "k1-315": [(JUST(315, 316), 330), (355, 330), (before(400), 330)],
    "k1-400": [(JUST(400, 401), 1), (532, 1), (before(700), 1)],
    "k1-700": [(700, 1), (751.5, 10**0.1), (before(800), 10 ** (100 / 515))],
    # (957.5 - 700)/515 = 0.5; 360/515 at the end
    "k1-800": [(800, 10 ** (100 / 515)), (957.5, 10**0.5), (before(1060), 10 ** (360 / 515))],
    "k1-1060": [(1060, 5), (1064, 5), (before(1400), 5)],
    "k1_short": [(1535, 100), (1540, 100), (before(1545), 100)],
}
#: Rows that the scheme names for the engine but does not use: no limit depends on the subtense.
UNUSED = {
    "alpha_min": [(1.0, 1.5)],
    "alpha_max": [(1.0, 100)],
    **{k: v for k, v in size_2013("gamma_ph").items() if k.startswith(("T2", "gamma_ph"))},
    **grouping("T_i", 5e-6, 13e-6),
    # On a boundary that two bands share the lower one holds for grouping times.
    "T_i-1400": [(JUST(1400, 1401), 1e-3), (1470, 1e-3)],
}
FACTORS = {
    IEC: {
        # 5.6e3 t^0.25: 1e-8 s 56, 1 s 5600, 16 s 11 200
        "C1": [(1e-8, 56), (1, 5600), (16, 11200)],
        "C2": [(302.5, 10**1.5), (305, 100), (310, 1000), (315, 1e4)],
        "T1": [(302.5, 1e-9), (305, 1e-7), (310, 1e-3), (315, 10)],
        # 0.06 C4: 0.06 x 10^0.2 at 800 nm, 0.06 x 10^0.7 = 0.3007 s at the end
        "T_3B-nir": [(700, 0.06), (800, 0.06 * 10**0.2), (850, 0.06 * 10**0.3), (1050, 0.06 * 10**0.7)],
        **spectral("C4", "C3", "C7", 700),
        **size_2013("gamma_ph"),
        **grouping("T_i", 5e-6, 13e-6),
    },
    US: {**K1, **UNUSED},
}


@pytest.mark.parametrize("scheme", SCHEMES)
def test_every_factor_row_is_hit_with_the_printed_value(scheme: str) -> None:
    hit = set()
    for f in compiled(scheme).factors.values():
        for piece in f.rows:
            for x, printed in FACTORS[scheme][piece.row]:
                assert factor(scheme, f.name, x) == pytest.approx(printed, rel=EXACT), (piece.row, x)
            hit.add(piece.row)
    assert hit == {r["row"] for r in table(scheme, "factors")}


def test_no_us_limit_uses_a_factor_that_stands_unused() -> None:
    used = {token.partition("^")[0] for r in table(US, "limits") for token in r["factors"].split()}
    assert used == {"k1", "k2", "k1_short"}
    breaks = {r[c] for r in table(US, "limits") for c in ("time_from_s", "time_to_s")}
    assert not breaks & {"T1", "T2"}


# 21 CFR 1040.10(d) Table IV (from memory): t x (nm - 699)/10100 from 700 to 800 nm, t/100 to 1400 nm,
# at least 1, growing up to 1e4 s.
K2 = {
    (699.9, 3e4): 1,
    (700.1, 3e4): 1.1 / 1.01,
    (750, 100): 1,
    # The break 10100/51 = 198.04 s
    (750, 198.0): 1,
    (750, 1000): 51000 / 10100,
    (750, 1e4): 51 / 1.01,
    (750, 3e4): 51 / 1.01,
    (799.9, 1e3): 100900 / 10100,
    (800, 99.0): 1,
    (800, 1e3): 10,
    (905, 5e3): 50,
    (1064, 1e-9): 1,
    (1064, 100): 1,
    (1064, 1e4): 100,
    (1064, 3e4): 100,
    (1399.9, 3e4): 100,
    (1401, 3e4): 1,
    (355, 3e4): 1,
    (532, 3e4): 1,
}


def test_the_factor_that_grows_with_time() -> None:
    at = np.array(list(K2), dtype=float)
    assert compiled(US).growth_factor(at[:, 0], at[:, 1]) == pytest.approx(list(K2.values()), rel=EXACT)


# IEC Table 10: condition, wavelength nm, time s -> row, aperture mm, distance m.
MEASURED = {
    IEC: {
        ("1", 302.5, 1.0): ("1-302-400", 7, 2),
        ("1", before(400), 3e4): ("1-302-400", 7, 2),
        ("1", 400.0, 1e-13): ("1-400-1400", 50, 2),
        ("1", before(1400), 3e4): ("1-400-1400", 50, 2),
        ("1", 1400.0, before(0.35)): ("1-1400-4000-short", 7, 2),
        ("1", 1550.0, 0.35): ("1-1400-4000-mid", 10.5 * 0.35**0.375, 2),
        ("1", 1550.0, 1.0): ("1-1400-4000-mid", 10.5, 2),
        ("1", before(4000), before(10)): ("1-1400-4000-mid", 10.5 * 10**0.375, 2),
        ("1", 1550.0, 10.0): ("1-1400-4000-long", 24.5, 2),
        ("1", 1550.0, 3e4): ("1-1400-4000-long", 24.5, 2),
        ("3", 180.0, 1.0): ("3-180-302", 1, 0),
        ("3", before(302.5), 1.0): ("3-180-302", 1, 0),
        ("3", 302.5, 1.0): ("3-302-400", 1, 0.1),
        ("3", 400.0, 1.0): ("3-400-1400", 7, 0.1),
        ("3", before(1400), 1.0): ("3-400-1400", 7, 0.1),
        ("3", 1400.0, before(0.35)): ("3-1400-4000-short", 1, 0.1),
        ("3", 1550.0, 1.0): ("3-1400-4000-mid", 1.5, 0.1),
        ("3", 1550.0, before(10)): ("3-1400-4000-mid", 1.5 * 10**0.375, 0.1),
        ("3", 1550.0, 10.0): ("3-1400-4000-long", 3.5, 0.1),
        ("3", 4000.0, 1e-9): ("3-4000-1e5-short", 1, 0),
        ("3", 10600.0, 0.35): ("3-4000-1e5-mid", 1.5 * 0.35**0.375, 0),
        ("3", 10600.0, 100.0): ("3-4000-1e5-long", 3.5, 0),
        ("3", before(1e5), 3e4): ("3-4000-1e5-long", 3.5, 0),
        ("3", 1e5, 1.0): ("3-far", 11, 0),
        ("3", 1e6, 3e4): ("3-far", 11, 0),
        # no telescope condition in these bands
        ("1", before(302.5), 1.0): ("", 0, 0),
        ("1", 4000.0, 1.0): ("", 0, 0),
        ("1", 10600.0, 1.0): ("", 0, 0),
        ("1", 1e6, 1.0): ("", 0, 0),
    },
    # 1040.10(e): 7 mm stop, within 200 mm, everywhere
    US: {
        ("3", w, t): ("3-all", 7, 0.2) for w, t in ((180.0, 1e-13), (633.0, 1.0), (10600.0, 10.0), (1e6, 3e4))
    },
}


@pytest.mark.parametrize("scheme", SCHEMES)
def test_every_measurement_row_is_hit(scheme: str) -> None:
    hit = set()
    for place, (row, aperture, distance) in MEASURED[scheme].items():
        found = measured(scheme, *place)
        assert found == (row, pytest.approx(aperture, rel=EXACT), distance), place
        hit.add(row)
    assert hit - {""} == {r["row"] for r in table(scheme, "measurement")}


@pytest.mark.parametrize("wavelength", [1550.0, 2000.0])
def test_the_telescope_sees_seven_times_the_aperture(wavelength: float) -> None:
    """1400-4000 nm: condition 1 is seven times the aperture of condition 3 (IEC Table 10, from memory)."""
    for t in (1e-6, before(0.35), 0.35, 1.0, before(10), 10.0, 100.0):
        aided, unaided = measured(IEC, "1", wavelength, t)[1], measured(IEC, "3", wavelength, t)[1]
        assert aided == pytest.approx(7 * unaided, rel=EXACT)


# IEC 4.3 e): 0.25 s for Classes 2, 2M and 3R in 400-700 nm, 100 s above 400 nm, 3e4 s up to 400 nm.
# US: 3e4 s (Class I), 1e3 s and 0.25 s from the tables; IIIa and IIIb common practice, no source.
BASES = {
    IEC: {
        "1": {180: 3e4, before(400): 3e4, 400: 100, 1e6: 100},
        "2": {before(400): None, 400: 0.25, before(700): 0.25, 700: None, 1e6: None},
        "3R": {302.5: 3e4, before(400): 3e4, 400: 0.25, before(700): 0.25, 700: 100, 1e6: 100},
        "3B": {180: 3e4, before(400): 3e4, 400: 100, 633: 100, 1e6: 100},
    },
    US: {
        "I": {180: 3e4, 633: 3e4, 1e6: 3e4},
        "IIa": {before(400): None, 400: 1e3, before(710): 1e3, 711: None},
        "II": {before(400): None, 400: 0.25, before(710): 0.25, 711: None},
        "IIIa": {before(400): None, 400: 0.25, before(710): 0.25, 711: None},
        "IIIb": {180: 10, 633: 10, 1e6: 10},
    },
}


@pytest.mark.parametrize("scheme", SCHEMES)
def test_every_time_base_is_hit(scheme: str) -> None:
    hit = set()
    for target, bases in BASES[scheme].items():
        found = compiled(scheme).time_base(target, np.array(list(bases), dtype=float))
        assert [None if math.isnan(t) else t for t in found] == list(bases.values()), target
        for row in table(scheme, "timebases"):
            low, high = float(row["wavelength_from_nm"]), float(row["wavelength_to_nm"])
            if row["target"] == target and any(low <= w < high for w in bases):
                assert float(row["duration_s"]) in bases.values()
                hit.add(row["row"])
    assert hit == {r["row"] for r in table(scheme, "timebases")}


#: Class 1, 2 and 3R share the factor C5 of IEC 4.3 f); Class 3B has none (Table 8 is left out of it).
C5 = {**LARGE, **SHORT, **LONG}


def test_every_repetition_row_stands_for_each_class() -> None:
    rows = {r["row"]: r for r in table(IEC, "repetition")}
    assert set(rows) == {f"{target}-{name}" for target in ("1", "2", "3R") for name in C5}
    numbers = ("coefficient", "count_power", "floor", "subtense_from_mrad", "subtense_to_mrad")
    for name, row in rows.items():
        same = rows[f"1-{name.partition('-')[2]}"]
        assert [row[c] for c in numbers] == [same[c] for c in numbers]
        assert row["target"] == name.partition("-")[0]
        assert (row["tissue"], row["effect"]) == ("retina", "thermal")


@pytest.mark.parametrize("name", C5)
def test_every_repetition_row_is_hit_with_the_printed_value(name: str) -> None:
    """The rows of the three classes are alike, so that the first of them answers for all."""
    repetition = compiled(IEC).repetition
    *train, printed = (np.array(column, dtype=float) for column in zip(*C5[name], strict=True))
    chosen = repetition.row(*train)
    assert [repetition.rows[n].row for n in chosen] == [f"1-{name}"] * len(printed)
    for target in ("1", "2", "3R"):
        (number,) = (k for k, r in enumerate(repetition.rows) if r.row == f"{target}-{name}")
        assert repetition(np.full(len(printed), number), train[-1]) == pytest.approx(printed, rel=EXACT)


def test_the_us_scheme_has_no_repetition_factor() -> None:
    (row,) = table(US, "repetition")
    assert (row["target"], row["coefficient"], row["count_power"]) == ("none", "1", "0")
    for target in compiled(US).targets:
        grid = compiled(US).grid.table[target]
        assert (grid[len(grid) // 2 :] == -1).all(), "a train has no row of its own"
