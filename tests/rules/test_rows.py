"""Every limit row of every rule set is asked for, and answers with the printed value.

Expected values come from `tests.reference.plain`, written from the published numbers alone: ICNIRP 2013
(from memory), Directive 2006/25/EC Annex II (read; Table 2.3 from memory), IEC 60825-1:2014 Annex A (from
memory), ANSI Z136.1-2014 (from memory). Nothing here is taken from the engine.
"""

from __future__ import annotations

import math
from functools import cache

import pytest

from tests.reference import plain
from tests.reference.plain_factors import t_2
from tests.rules.engine import LAST_NM, LAST_S, RULES, Held, held, table

EXACT = 1e-12
Point = tuple[float, float, float]


def t1_iec(wavelength_nm: float) -> float:
    """T1 [s], 302.5-315 nm. IEC 60825-1:2014 Table 9, from memory; read in the TR 60825-14 sheet."""
    return 1e-15 * 10 ** (0.8 * (wavelength_nm - 295))


def inside(low: float, high: float, last: float) -> list[float]:
    """The lower edge of a band, points inside it, its last float and, for the last band, its end."""
    middle = math.sqrt(low * high)
    points = [low, math.nextafter(low, high), low + (middle - low) / 3, middle, math.nextafter(high, low)]
    return [*points, high] if high == last else points


def subtenses(row: dict[str, str]) -> list[float]:
    if row["subtense_to_mrad"]:
        return [0.5, 1.5]  # small source; 0.5 counts as 1.5 mrad
    if row["subtense_from_mrad"]:
        return [math.nextafter(1.5, 2), 2.0, 30.0, 100.0, 150.0]
    return [0.5, 1.5, 4.0, 30.0, 150.0]


def time(bound: str, wavelength_nm: float, alpha_mrad: float) -> float:
    """A time bound [s]; a break time at this wavelength or subtense."""
    if bound == "T1":
        return t1_iec(wavelength_nm)
    return t_2(alpha_mrad) if bound == "T2" else float(bound)


def points(row: dict[str, str]) -> list[Point]:
    """Points at which a row must hold: lower edges, inside, upper edges less one float."""
    found = []
    low, high = float(row["wavelength_from_nm"]), float(row["wavelength_to_nm"])
    for wavelength in inside(low, high, LAST_NM):
        for alpha in subtenses(row):
            start = time(row["time_from_s"], wavelength, alpha)
            end = time(row["time_to_s"], wavelength, alpha)
            # A break time is passed by 1e-9 of itself, so that its last bit decides nothing.
            if row["time_from_s"] in ("T1", "T2"):
                start *= 1 + 1e-9
            if row["time_to_s"] in ("T1", "T2"):
                end *= 1 - 1e-9
            if start < end:
                found += [(wavelength, t, alpha) for t in inside(start, end, LAST_S)]
    return found


@cache
def answers(rules: str) -> dict[tuple[str, str], list[tuple[Point, list[Held]]]]:
    """(target, row) -> what the engine says at each point of the row."""
    found = {}
    for row in table(rules, "limits"):
        at = points(row)
        assert at, row["row"]
        found[row["target"], row["row"]] = list(zip(at, held(rules, row["target"], at), strict=True))
    return found


@pytest.mark.parametrize("rules", RULES)
def test_every_limit_row_is_hit_with_the_printed_value(rules: str) -> None:
    """At each point of its band the row holds, and its value is the printed one of tissue and effect."""
    hit = set()
    for (target, name), found in answers(rules).items():
        for (wavelength, t, alpha), rows in found:
            mine = [h for h in rows if h.row == name]
            assert len(mine) == 1, (name, wavelength, t, alpha)
            printed = [
                h
                for tissue, effect, h in plain.limits(rules, target, wavelength, t, alpha)
                if (tissue, effect) == (mine[0].tissue, mine[0].effect)
            ]
            assert any(mine[0].limit_j_m2 == pytest.approx(h, rel=EXACT, abs=0) for h in printed), (
                name,
                wavelength,
                t,
                alpha,
                mine[0].limit_j_m2,
                printed,
            )
            hit.add(name)
    assert hit == {r["row"] for r in table(rules, "limits")}


@pytest.mark.parametrize("rules", RULES)
def test_no_row_holds_that_is_not_printed(rules: str) -> None:
    """The whole answer, every tissue and effect, is the printed list, at every point of every row."""
    for (target, _), found in answers(rules).items():
        for (wavelength, t, alpha), rows in found:
            printed = sorted(plain.limits(rules, target, wavelength, t, alpha))
            ours = sorted((h.tissue, h.effect, h.limit_j_m2) for h in rows)
            assert [o[:2] for o in ours] == [p[:2] for p in printed], (wavelength, t, alpha)
            assert [o[2] for o in ours] == pytest.approx([p[2] for p in printed], rel=EXACT, abs=0), (
                wavelength,
                t,
            )


@pytest.mark.parametrize("rules", RULES)
def test_every_aperture_row_is_hit_with_the_printed_diameter(rules: str) -> None:
    """Printed: ICNIRP 2013, IEC Table A.6, ANSI Table 8a (from memory), 2006/25/EC Tables 2.2 to 2.4."""
    hit = set()
    for (target, name), found in answers(rules).items():
        for (wavelength, t, _), rows in found:
            mine = next(h for h in rows if h.row == name)
            printed = plain.aperture_m(rules, target, wavelength, t, mine.tissue) * 1e3
            assert mine.aperture_mm == pytest.approx(printed, rel=EXACT, abs=0), (name, wavelength, t)
            hit.add(mine.aperture)
    # Bands of wavelength and time that no limit row starts in: asked for by hand below.
    for wavelength, t, target, tissue, mm, aperture in BY_HAND[rules]:
        rows = held(rules, target, [(wavelength, t, 1.5)])[0]
        mine = next(h for h in rows if h.tissue == tissue)
        assert (mine.aperture, mine.aperture_mm) == (aperture, pytest.approx(mm, rel=EXACT, abs=0)), (
            wavelength,
            t,
        )
        hit.add(aperture)
    assert hit == {r["row"] for r in table(rules, "apertures")}


# 1.5 x 1^0.375 = 1.5 mm; 1.5 x 10^0.375 = 3.557 mm just below 10 s. Break at 0.35 s: ICNIRP and IEC (read in
# BGV B2 Tabelle 5); at 0.3 s: 2006/25/EC (read) and ANSI (from memory).
FAR = [
    (1e5, 1e-3, "eye", "cornea", 11.0, "eye-far"),
    (math.nextafter(1e5, 0), 1e-3, "eye", "cornea", 1.0, "eye-ir-short"),
    (1e6, 3e4, "eye", "cornea", 11.0, "eye-far"),
]
SKIN_FAR = [
    (math.nextafter(1e5, 0), 1.0, "skin", "skin", 3.5, "skin"),
    (1e5, 1.0, "skin", "skin", 11.0, "skin-far"),
    (1e6, 3e4, "skin", "skin", 11.0, "skin-far"),
]
RETINA = [
    (400.0, 1e-13, "eye", "retina", 7.0, "eye-retina"),
    (1399.9, 3e4, "eye", "retina", 7.0, "eye-retina"),
]


def graded(wavelength: float, tissue: str, name: str, first: float) -> list[tuple]:
    return [
        (wavelength, math.nextafter(first, 0), "eye", tissue, 1.0, f"{name}-short"),
        (wavelength, first, "eye", tissue, 1.5 * first**0.375, f"{name}-mid"),
        (wavelength, 1.0, "eye", tissue, 1.5, f"{name}-mid"),
        (wavelength, math.nextafter(10, 0), "eye", tissue, 1.5 * 10**0.375, f"{name}-mid"),
        (wavelength, 10.0, "eye", tissue, 3.5, f"{name}-long"),
        (wavelength, 3e4, "eye", tissue, 3.5, f"{name}-long"),
    ]


BY_HAND = {
    "icnirp-2013": [
        *graded(350.0, "lens", "eye-uv", 0.35),
        *graded(1e4, "cornea", "eye-ir", 0.35),
        *(FAR + SKIN_FAR + RETINA),
        (1300.0, 1.0, "eye", "anterior", 3.5, "eye-anterior"),
    ],
    "eu-2006-25": [
        *graded(350.0, "lens", "eye-uv", 0.3),
        *graded(1e4, "cornea", "eye-ir", 0.3),
        *(FAR + RETINA),
        (1e6, 1.0, "skin", "skin", 3.5, "skin"),  # no 11 mm in Table 2.4
    ],
    "iec-60825-1-2014": [
        (350.0, 1e-9, "eye", "lens", 1.0, "eye-uv"),
        (350.0, 3e4, "eye", "lens", 1.0, "eye-uv"),
        *graded(1e4, "cornea", "eye-ir", 0.35),
        *(FAR + SKIN_FAR + RETINA),
        (1300.0, 1.0, "eye", "anterior", 3.5, "eye-anterior"),
    ],
    "ansi-z136-1-2014": [
        *graded(350.0, "lens", "eye-uv", 0.3),
        *graded(1e4, "cornea", "eye-ir", 0.3),
        *(FAR + SKIN_FAR + RETINA),
        *graded(1300.0, "anterior", "eye-anterior", 0.3),
    ],
}


def test_hand_worked_limits() -> None:
    """A few rows worked out on paper, so that not everything hangs on the plain implementation.

    ICNIRP 2013, IEC Annex A, ANSI Tables 5b-5d from memory; 2006/25/EC Table 2.2 read, 2.3 from memory.
    """
    paper = {
        # 18 x (1e-4)^0.75 = 18e-3
        ("icnirp-2013", 532.0, 1e-4, 1.5, "retina", "thermal"): 18e-3,
        # 2e-3 x 5 / 1.5, alpha = alpha_max = 5 mrad below 625 us
        ("icnirp-2013", 532.0, 1e-6, 5.0, "retina", "thermal"): 2e-3 * 5 / 1.5,
        # wider than alpha_max: 2e-3 x 30^2 / (1.5 x 5)
        ("icnirp-2013", 532.0, 1e-6, 30.0, "retina", "thermal"): 2e-3 * 120,
        # 10 W/m2 x 10^0.216 x 100 s
        ("icnirp-2013", 808.0, 100.0, 1.5, "retina", "thermal"): 1000 * 10**0.216,
        # T2 at 100 mrad is 100 s: 18 x 100^-0.25 x (100 / 1.5) x 1e4 s
        ("icnirp-2013", 532.0, 1e4, 100.0, "retina", "thermal"): 18 / math.sqrt(10) * 1e6 / 1.5,
        # C_B(470) = 10^0.4; gamma(400 s) = 22 mrad, alpha 44 mrad: x 4; 400 s
        ("icnirp-2013", 470.0, 400.0, 44.0, "retina", "photochemical"): 400 * 10**0.4 * 4,
        # 1300 nm: 2e-2 x (8 + 10^2)
        ("icnirp-2013", 1300.0, 1e-9, 1.5, "retina", "thermal"): 2e-2 * 108,
        # 1300 nm, skin limit as second limit: 200 x 5
        ("icnirp-2013", 1300.0, 1e-8, 1.5, "anterior", "thermal"): 1000.0,
        # 2.7e4 x (1e-10)^0.75 at 800 nm: x 10^0.2
        ("eu-2006-25", 800.0, 1e-10, 1.5, "retina", "thermal"): 2.7e4 * 10**-7.5 * 10**0.2,
        # 700-1400 nm, beyond T2, 1250 nm, 100 mrad: 18/sqrt(10) x 5 x 8 x 66.7 = 15 179, capped at 1000 W/m2
        ("eu-2006-25", 1250.0, 1000.0, 100.0, "retina", "thermal"): 1000.0 * 1000,
        # 5.6e3 x (1e-8)^0.25 = 56 at 308 nm before 26 us
        ("eu-2006-25", 308.7, 1e-8, 1.5, "cornea/lens", "thermal"): 56.0,
        # C2(308) = 10^2.6
        ("iec-60825-1-2014", 308.0, 100.0, 1.5, "cornea/lens", "photochemical"): 10**2.6,
        # 10 W/m2 beyond 1000 s, 315-400 nm
        ("iec-60825-1-2014", 355.0, 3e4, 1.5, "lens", "photochemical"): 3e5,
        # 50 W/m2 x C_C(1200) = 8 + 10^-2
        ("ansi-z136-1-2014", 1200.0, 10.0, 1.5, "retina", "thermal"): 500 * 8.01,
    }
    for (rules, wavelength, t, alpha, tissue, effect), h in paper.items():
        rows = held(rules, "eye", [(wavelength, t, alpha)])[0]
        found = [r.limit_j_m2 for r in rows if (r.tissue, r.effect) == (tissue, effect)]
        assert found == [pytest.approx(h, rel=EXACT, abs=0)], (rules, wavelength, t, alpha)
