"""Every factor, repetition, duration and additivity row hit, with values worked out by hand.

Sources: ICNIRP 2013, IEC 60825-1:2014 Table 9 and 4.3, ANSI Z136.1-2014 Table 6 and 8.2.3 (all from
memory), 2006/25/EC Annex II Tables 2.5 and 2.6 (read), BGI 832 Tabelle 1 (read), TROS Laserstrahlung
part 2, 4.1 (read).
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from service.rules.ruleset import load_all
from tests.rules.engine import ANSI, DATA, EU, ICNIRP, IEC, RULES, compiled, factor, table

EXACT = 1e-12
JUST = math.nextafter


def before(x: float) -> float:
    return JUST(x, 0)


def spectral(a: str, b: str, c: str, c_from: int) -> dict[str, list[tuple[float, float]]]:
    """C_A, C_B and C_C (C4, C3, C7) of the 2013 family; edges belong to the upper piece."""
    low = [(700, 1), (905, 1)] if c_from == 700 else []
    return {
        f"{a}-vis": [(400, 1), (550, 1), (before(700), 1)],
        # 10^(0.002 x 108) = 10^0.216 = 1.6444
        f"{a}-nir": [(700, 1), (808, 10**0.216), (785, 10**0.17), (before(1050), 10**0.7)],
        f"{a}-ir": [(1050, 5), (1064, 5), (1400, 5)],
        f"{b}-400": [(400, 1), (445, 1), (before(450), 1)],
        f"{b}-450": [(450, 1), (470, 10**0.4), (500, 10.0), (550, 100.0), (before(600), 1000.0)],
        f"{c}-{c_from}": [*low, (1050, 1), (1064, 1), (before(1150), 1)],
        f"{c}-1150": [(1150, 1), (1175, 10**0.45), (before(1200), 10**0.9)],
        # 8 + 10^(0.04(x - 1250)): 8.01, 9, 8 + 10^2.4, 8 + 10^6
        f"{c}-1200": [(1200, 8.01), (1250, 9.0), (1310, 8 + 10**2.4), (1400, 8 + 1e6)],
    }


def size_2013(gamma: str) -> dict[str, list[tuple[float, float]]]:
    return {
        "alpha_min": [(1e-13, 1.5), (0.25, 1.5), (3e4, 1.5)],
        "alpha_max-short": [(1e-13, 5), (1e-6, 5), (before(625e-6), 5)],
        # 200 t^0.5: 0.01 s gives 20, 0.04 s gives 40, 625 us gives 5
        "alpha_max-mid": [(625e-6, 5), (0.01, 20), (0.04, 40), (before(0.25), 100)],
        "alpha_max-long": [(0.25, 100), (10, 100), (3e4, 100)],
        "T2-small": [(0, 10), (1, 10), (before(1.5), 10)],
        # (50.75 - 1.5)/98.5 = 0.5; (21.2 - 1.5)/98.5 = 0.2
        "T2-mid": [(1.5, 10), (21.2, 10**1.2), (50.75, 10**1.5), (before(100), 100)],
        "T2-large": [(100, 100), (150, 100)],
        f"{gamma}-short": [(10, 11), (50, 11), (before(100), 11)],
        # 1.1 t^0.5: 100 s 11, 400 s 22, 2500 s 55
        f"{gamma}-mid": [(100, 11), (400, 22), (2500, 55), (before(1e4), 110)],
        f"{gamma}-long": [(1e4, 110), (3e4, 110)],
    }


def grouping(name: str, visible: float, near: float) -> dict[str, list[tuple[float, float]]]:
    return {
        f"{name}-400": [(400, visible), (1049.9, visible)],
        f"{name}-1050": [(1050, near), (1064, near), (before(1400), near)],
        f"{name}-1400": [(1400, 1e-3), (1470, 1e-3)],
        f"{name}-1500": [(1500, 10), (1550, 10)],
        f"{name}-1800": [(1800, 1e-3), (1940, 1e-3)],
        f"{name}-2600": [(2600, 1e-7), (10600, 1e-7), (1e6, 1e-7)],
    }


# 10 x 10^(0.02 x 20) at 470 nm
BLUE_BREAK = [(450, 10), (470, 10**1.4), (before(500), 100)]

FACTORS = {
    ICNIRP: {
        **spectral("C_A", "C_B", "C_C", 700),
        **size_2013("gamma"),
        "T1-450": [*BLUE_BREAK, (500, 100)],
        **grouping("T_i", 5e-6, 13e-6),
    },
    IEC: {
        # 5.6e3 t^0.25: 1e-8 s 56, 1 s 5600, 16 s 11 200
        "C1": [(1e-8, 56), (1, 5600), (16, 11200)],
        "C2": [(302.5, 10**1.5), (305, 100), (310, 1000), (315, 1e4)],
        "T1": [(302.5, 1e-9), (305, 1e-7), (310, 1e-3), (315, 10)],
        **spectral("C4", "C3", "C7", 700),
        **size_2013("gamma_ph"),
        **grouping("T_i", 5e-6, 13e-6),
    },
    ANSI: {
        **spectral("C_A", "C_B", "C_C", 1050),
        **size_2013("gamma"),
        "T1-450": [*BLUE_BREAK, (500, 100)],
        **grouping("t_min", 5e-6, 13e-6),
    },
    # Shared boundaries are left to the check of note a below; here the insides of the pieces.
    EU: {
        **spectral("C_A", "C_B", "C_C", 700),
        **size_2013("gamma"),
        "C_A-ir": [(JUST(1050, 1051), 5), (1064, 5), (1400, 5)],
        # to 700 nm in Table 2.5
        "C_B-450": [(450, 1), (470, 10**0.4), (550, 100), (650, 10**4)],
        "C_C-1200": [(JUST(1200, 1201), 8), (1310, 8), (1400, 8)],
        "alpha_max": [(1e-13, 100), (1e-3, 100), (3e4, 100)],
        "gamma-short": [(1e-13, 11), (0.25, 11), (before(100), 11)],
        "T1-400": [(400, 10), (430, 10)],
        "T1-450": BLUE_BREAK,
        "T1-500": [(JUST(500, 501), 100), (600, 100)],
        "T_min-315": [(316, 1e-9), (355, 1e-9), (400, 1e-9)],
        "T_min-400": [(JUST(400, 401), 18e-6), (532, 18e-6), (1050, 18e-6)],
        "T_min-1050": [(JUST(1050, 1051), 50e-6), (1064, 50e-6), (1400, 50e-6)],
        "T_min-1400": [(JUST(1400, 1401), 1e-3), (1470, 1e-3), (1500, 1e-3)],
        "T_min-1500": [(JUST(1500, 1501), 10), (1550, 10), (1800, 10)],
        "T_min-1800": [(JUST(1800, 1801), 1e-3), (1940, 1e-3), (2600, 1e-3)],
        "T_min-2600": [(JUST(2600, 2601), 1e-7), (10600, 1e-7), (1e6, 1e-7)],
    },
}


@pytest.mark.parametrize("rules", RULES)
def test_every_factor_row_is_hit_with_the_printed_value(rules: str) -> None:
    hit = set()
    for f in compiled(rules).factors.values():
        for piece in f.rows:
            for x, printed in FACTORS[rules][piece.row]:
                assert factor(rules, f.name, x) == pytest.approx(printed, rel=EXACT), (piece.row, x)
            hit.add(piece.row)
    assert hit == {r["row"] for r in table(rules, "factors")}


def test_shared_factor_boundaries_of_2006_25_take_the_stricter_value() -> None:
    """Note a to Tables 2.2-2.4 (read): the more restrictive of two rows that meet.

    C_C 1200: 10^0.9 = 7.94 against 8. T_min: Table 2.6 (read) prints its bands with the upper end
    included, so the lower band holds at its end.
    """
    both = {
        "C_A": {700: (1, 1), 1050: (10**0.7, 5)},
        "C_C": {1150: (1, 1), 1200: (10**0.9, 8)},
        "C_B": {450: (1, 1)},
        "T_min": {400: (1e-9, 18e-6), 1050: (18e-6, 50e-6), 1400: (50e-6, 1e-3), 1500: (1e-3, 10),
                  1800: (10, 1e-3), 2600: (1e-3, 1e-7)},
    }  # fmt: skip
    for name, edges in both.items():
        for x, (below, above) in edges.items():
            expected = below if name == "T_min" else min(below, above)
            assert factor(EU, name, x) == pytest.approx(expected, rel=EXACT), (name, x)
            assert factor(EU, name, before(x)) == pytest.approx(below, rel=1e-9), (name, x)
            assert factor(EU, name, JUST(x, math.inf)) == pytest.approx(above, rel=1e-9), (name, x)


# Repetition. (pulse s, grouping s, exposure s, alpha mrad, N, printed C_P); alpha_max is taken at the pulse:
# 0.01 s 20 mrad, 0.04 s 40 mrad, 1 s 100 mrad, 1e-4 s 5 mrad. N^-0.25: 16 0.5, 81 1/3, 256 0.25, 625 0.2.
LARGE = {"large": [(1e-9, 5e-6, 10, JUST(100, 101), 1e6, 1), (1.0, 5e-6, 10, 150, 1e6, 1)]}
LONG = {
    "long-small": [(1e-4, 5e-6, 10, 1.5, 1e6, 1), (0.01, 5e-6, 10, 5.0, 1e6, 1)],
    "long-mid-few": [(0.01, 5e-6, 10, 6.0, 16, 0.5), (0.01, 5e-6, 10, 20.0, 40, 40**-0.25)],
    "long-mid-many": [(0.01, 5e-6, 10, 6.0, JUST(40, 41), 0.4), (0.04, 5e-6, 10, 40.0, 1e9, 0.4)],
    "long-wide-few": [
        (0.01, 5e-6, 10, 20.1, 256, 0.25),
        (1e-4, 5e-6, 10, 5.1, 81, 1 / 3),
        (0.01, 5e-6, 10, 100.0, 625, 0.2),
    ],
    "long-wide-many": [(0.01, 5e-6, 10, 20.1, JUST(625, 626), 0.2), (1e-4, 5e-6, 10, 99, 1e9, 0.2)],
}
SHORT = {
    "short-brief": [(5e-6, 5e-6, 0.25, 1.5, 1e6, 1), (1e-9, 5e-6, 0.1, 4.0, 1e6, 1)],
    "short-few": [(1e-9, 5e-6, JUST(0.25, 1), 1.5, 600, 1), (1e-9, 5e-6, 10, 4.0, 1, 1)],
    # 5 N^-0.25: 1 at 625, 0.5 at 10 000, 0.4 at 24 414.06; below 625 the value is above 1 and counts as 1
    "short-many": [
        (1e-9, 5e-6, 10, 1.5, JUST(600, 601), 1),
        (1e-9, 5e-6, 10, 1.5, 625, 1),
        (1e-9, 5e-6, 10, 5.0, 1e4, 0.5),
        (5e-6, 5e-6, 10, 1.5, 24414, 5 / 24414**0.25),
        (5e-6, 5e-6, 10, 1.5, 24415, 0.4),
        (1e-9, 5e-6, 10, 99.0, 1e9, 0.4),
    ],
}
# ANSI: short pulses take the stricter of the size rule and the 2013 rule (a remembered uncertainty).
SHORT_ANSI = {
    "short-small-brief": [(5e-6, 5e-6, 0.25, 1.5, 1e6, 1), (1e-9, 5e-6, 0.1, 5.0, 1e6, 1)],
    "short-small-few": [(1e-9, 5e-6, 10, 1.5, 600, 1)],
    "short-small-many": [(1e-9, 5e-6, 10, 5.0, 1e4, 0.5), (1e-9, 5e-6, 10, 1.5, 24415, 0.4)],
    "short-wide-few": [(1e-9, 5e-6, 0.25, 5.1, 16, 0.5), (1e-9, 5e-6, 10, 100, 625, 0.2)],
    "short-wide-many": [(1e-9, 5e-6, 10, 50, 1e5, 0.2)],
}
CASES = {
    ICNIRP: {**LARGE, **SHORT, **LONG},
    IEC: {**LARGE, **SHORT, **LONG},
    ANSI: {**LARGE, **SHORT_ANSI, **LONG},
    EU: {"thermal": [(1e-9, 18e-6, 10, 1.5, 16, 0.5), (1.0, 0.0, 10, 150, 1e4, 0.1), (1, 0, 10, 1.5, 1, 1)]},
}


@pytest.mark.parametrize("rules", RULES)
def test_every_repetition_row_is_hit_with_the_printed_value(rules: str) -> None:
    repetition = compiled(rules).repetition
    assert set(CASES[rules]) == {r["row"] for r in table(rules, "repetition")}
    for name, cases in CASES[rules].items():
        *train, printed = (np.array(column, dtype=float) for column in zip(*cases, strict=True))
        chosen = repetition.row(*train)
        assert [repetition.rows[n].row for n in chosen] == [name] * len(cases)
        assert repetition(chosen, train[-1]) == pytest.approx(printed, rel=EXACT), name


@pytest.mark.parametrize("rules", RULES)
def test_every_train_finds_a_row_and_no_factor_exceeds_one(rules: str) -> None:
    rng = np.random.default_rng(5)
    n = 20000
    pulse, exposure = 10 ** rng.uniform(-13, 1, n), 10 ** rng.uniform(-9, 4.4, n)
    alpha, count = 10 ** rng.uniform(np.log10(1.5), 2.3, n), 10 ** rng.uniform(0, 9, n)
    repetition = compiled(rules).repetition
    chosen = repetition.row(pulse, np.full(n, 5e-6), exposure, alpha, count)
    assert (chosen >= 0).all()
    value = repetition(chosen, count)
    assert (value <= 1).all()
    assert (value > 0).all()


# Conventional durations: TROS Laserstrahlung part 2, 4.1 (read); ANSI practice (from memory).
@pytest.mark.parametrize("rules", RULES)
def test_every_default_duration_is_hit(rules: str) -> None:
    beyond = 10.0 if rules == ANSI else 100.0
    points = {180.0: 3e4, before(400): 3e4, 400.0: 0.25, before(700): 0.25, 700.0: beyond, 1e6: beyond}
    seconds, rows = compiled(rules).default_duration(np.array(list(points)))
    assert seconds.tolist() == list(points.values())
    names = {load_all(DATA)[rules].durations[k].row for k in rows}
    assert names == {r["row"] for r in table(rules, "durations") if r["kind"] == "default"}


@pytest.mark.parametrize("rules", RULES)
def test_every_additivity_row_decides_a_pair_of_limit_rows(rules: str) -> None:
    """BGI 832 Tabelle 1 (read): rows of one class add; retina and anterior tissue stay apart."""
    published, classes = compiled(rules).rules, compiled(rules).additivity
    front = {"cornea", "cornea/lens", "lens"}
    for line in table(rules, "additivity"):
        bands = [(float(line[f"{a}_from_nm"]), float(line[f"{a}_to_nm"])) for a in ("band", "with")]
        for target in ("eye", "skin"):
            pairs = 0
            for j, one in enumerate(published.limits):
                for k, two in enumerate(published.limits):
                    inside = all(
                        low <= r.wavelength_from_nm < high
                        for r, (low, high) in zip((one, two), bands, strict=True)
                    )
                    if not inside or one.target != target or two.target != target:
                        continue
                    apart = (
                        target == "eye" and one.tissue != two.tissue and not {one.tissue, two.tissue} <= front
                    )
                    assert (classes[j] == classes[k]) == (line[target] == "yes" and not apart), (
                        one.row,
                        two.row,
                    )
                    pairs += 1
            assert pairs, (line["row"], target)
