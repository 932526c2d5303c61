"""Every emission limit of both class schemes is asked for, and answers with the printed value.

Expected values come from `tests.reference.plain_classes`, written from the published numbers alone, or are
worked out by hand: IEC 60825-1:2014 Tables 3 to 8, 21 CFR 1040.10(d) Tables I to III-B, both from memory.
"""

from __future__ import annotations

import math
from functools import cache

import pytest

from tests.reference import plain_classes
from tests.reference.plain_factors import t_2
from tests.rules.class_engine import IEC, SCHEMES, US, Held, Point, held, table
from tests.rules.engine import LAST_NM, LAST_S
from tests.rules.test_rows import inside, subtenses, t1_iec

EXACT = 1e-12
JUST = math.nextafter


def t_3b(wavelength_nm: float) -> float:
    """0.06 C4 [s], 700-1050 nm. IEC 60825-1:2014 Table 8, from memory."""
    return 0.06 * 10 ** (0.002 * (wavelength_nm - 700))


def time(bound: str, wavelength_nm: float, alpha_mrad: float) -> float:
    """A time bound [s]; a break time at this wavelength or subtense."""
    if bound == "T2":
        return t_2(alpha_mrad)
    breaks = {"T1": t1_iec, "T_3B": t_3b}
    return breaks[bound](wavelength_nm) if bound in breaks else float(bound)


def points(scheme: str, row: dict[str, str]) -> list[Point]:
    """Points at which a row must hold: lower edges, inside, upper edges less one float."""
    found = []
    low, high = float(row["wavelength_from_nm"]), float(row["wavelength_to_nm"])
    for edge in inside(low, high, LAST_NM):
        # 21 CFR 1040.10(d) prints its bands as above their lower end.
        wavelength = JUST(edge, math.inf) if scheme == US and edge == low else edge
        for alpha in subtenses(row):
            start = time(row["time_from_s"], wavelength, alpha)
            end = time(row["time_to_s"], wavelength, alpha)
            # A break time is passed by 1e-9 of itself, so that its last bit decides nothing.
            if row["time_from_s"].startswith("T"):
                start *= 1 + 1e-9
            if row["time_to_s"].startswith("T"):
                end *= 1 - 1e-9
            if start < end:
                found += [(wavelength, t, alpha) for t in inside(start, end, LAST_S)]
    return found


@cache
def answers(scheme: str) -> dict[tuple[str, str], list[tuple[Point, list[Held]]]]:
    """(class, row) -> what the engine says at each point of the row."""
    found = {}
    for row in table(scheme, "limits"):
        at = points(scheme, row)
        assert at, row["row"]
        found[row["target"], row["row"]] = list(zip(at, held(scheme, row["target"], at), strict=True))
    return found


def tissue(scheme: str, name: str) -> str:
    """21 CFR 1040.10 names no tissue; its ultraviolet rows are told apart from the retina only."""
    return name if scheme == IEC or name == "retina" else "front"


@pytest.mark.parametrize("scheme", SCHEMES)
def test_every_limit_row_is_hit_with_the_printed_value(scheme: str) -> None:
    """At each point of its band the row holds, with the printed value of its tissue, effect and unit."""
    hit = set()
    for (target, name), found in answers(scheme).items():
        for at, rows in found:
            mine = [h for h in rows if h.row == name]
            assert len(mine) == 1, (name, at)
            kind = (tissue(scheme, mine[0].tissue), mine[0].effect, mine[0].unit)
            if scheme == US:
                kind = (kind[0], "thermal", kind[2])
            printed = [
                dose
                for where, effect, unit, dose in plain_classes.ael(scheme, target, *at)
                if (tissue(scheme, where), effect, unit) == kind
            ]
            assert printed == [pytest.approx(mine[0].dose, rel=EXACT, abs=0)], (name, at)
            hit.add(name)
    assert hit == {r["row"] for r in table(scheme, "limits")}


@pytest.mark.parametrize("scheme", SCHEMES)
def test_no_row_holds_that_is_not_printed(scheme: str) -> None:
    """The whole answer of a class is the printed list, at every point of every row."""
    for (target, _), found in answers(scheme).items():
        for at, rows in found:
            printed = sorted(
                (tissue(scheme, where), effect, unit, dose)
                for where, effect, unit, dose in plain_classes.ael(scheme, target, *at)
            )
            ours = sorted((tissue(scheme, h.tissue), h.effect, h.unit, h.dose) for h in rows)
            assert [o[:3] for o in ours] == [p[:3] for p in printed], (target, at)
            assert [o[3] for o in ours] == pytest.approx([p[3] for p in printed], rel=EXACT, abs=0), at


# Class, wavelength nm, time s, subtense mrad, effect, unit: dose worked out on paper.
IEC_PAPER = {
    # Table 3: 30 J/m2; 3e10 W/m2 x 0.1 ns
    ("1", 250.0, 1.0, 1.5, "photochemical", "J/m2"): 30.0,
    ("1", 250.0, 1e-10, 1.5, "thermal", "J/m2"): 3.0,
    # C2(310) = 10^3; 2.4e4 W x 0.1 ns
    ("1", 310.0, 100.0, 1.5, "photochemical", "J"): 7.9e-4,
    ("1", 310.0, 1e-10, 1.5, "thermal", "J"): 2.4e-6,
    # C1(1e-8 s) = 5600 x 0.01 = 56; T1(310 nm) = 10^12 x 1e-15 = 1 ms
    ("1", 310.0, 1e-8, 1.5, "thermal", "J"): 7.9e-7 * 56,
    ("1", 355.0, 3e4, 1.5, "photochemical", "J"): 7.9e-6 * 3e4,
    # 7e-4 x (1e-4)^0.75 = 7e-7
    ("1", 532.0, 1e-4, 1.5, "thermal", "J"): 7e-7,
    ("1", 633.0, 100.0, 1.5, "thermal", "J"): 3.9e-2,
    # C3(470) = 10^0.4: both limits of the dual cell, then blue light alone
    ("1", 470.0, 50.0, 1.5, "photochemical", "J"): 3.9e-3 * 10**0.4,
    ("1", 470.0, 50.0, 1.5, "thermal", "J"): 3.9e-4 * 50,
    ("1", 470.0, 200.0, 1.5, "photochemical", "J"): 3.9e-5 * 10**0.4 * 200,
    # C4(850) = 10^0.3
    ("1", 850.0, 100.0, 1.5, "thermal", "J"): 3.9e-2 * 10**0.3,
    # C4 = 5, C7(1310) = 8 + 10^2.4: the retinal limit; the anterior one is below
    ("1", 1310.0, 1e-9, 1.5, "thermal", "J"): 7.7e-7 * (8 + 10**2.4),
    ("1", 1550.0, 1.0, 1.5, "thermal", "J"): 1.8e-2,
    ("1", 10600.0, 100.0, 1.5, "thermal", "J/m2"): 1e5,
    # Table 4: T2(50.75 mrad) = 10^1.5, C6 = 33.83; 7e-4 x 10^-0.375 W x 100 s
    ("1", 633.0, 100.0, 50.75, "thermal", "J"): 7e-4 * 10**-0.375 * 50.75 / 1.5 * 100,
    # gamma_ph(400 s) = 22 mrad, 44 mrad wide: x 4
    ("1", 450.0, 400.0, 44.0, "photochemical", "J"): 3.9e-5 * 4 * 400,
    # Table 5: C6 = 10/1.5 at 0.25 s
    ("2", 532.0, 0.25, 10.0, "thermal", "J"): 2.5e-4 * 10 / 1.5,
    # Table 6: 5 mW; 2 mW x C4; 5e-2 t J; 2.8e4 t^0.25 J/m2
    ("3R", 532.0, 0.25, 1.5, "thermal", "J"): 1.25e-3,
    ("3R", 850.0, 100.0, 1.5, "thermal", "J"): 0.2 * 10**0.3,
    ("3R", 1940.0, 1.0, 1.5, "thermal", "J"): 5e-2,
    ("3R", 10600.0, 1.0, 1.5, "thermal", "J/m2"): 2.8e4,
    # Table 7: T2(100 mrad) = 100 s; C6 = 66.7, C4 = 5 at 1064 nm
    ("3R", 1064.0, 100.0, 100.0, "thermal", "J"): 3.5e-3 * 10**-0.5 * 5 / 1.5 * 1e4,
    # Table 8
    ("3B", 250.0, 100.0, 1.5, "thermal", "J"): 0.15,
    ("3B", 310.0, 1.0, 1.5, "thermal", "J"): 0.05,
    ("3B", 532.0, 0.01, 1.5, "thermal", "J"): 0.03,
    ("3B", 532.0, 1.0, 1.5, "thermal", "J"): 0.5,
    # 0.06 C4 = 0.1197 s at 850 nm: 0.03 C4 J before, 0.5 W after
    ("3B", 850.0, 0.1, 1.5, "thermal", "J"): 0.03 * 10**0.3,
    ("3B", 850.0, 0.13, 1.5, "thermal", "J"): 0.065,
    ("3B", 10600.0, 1e-10, 1.5, "thermal", "J"): 1.25e-2,
}
US_PAPER = {
    # Table IV: k1(307.4) = 10; 330 above 315 nm
    ("I", 307.4, 100.0, 1.5, "thermal", "J"): 2.4e-4,
    ("I", 355.0, 3e4, 1.5, "thermal", "J"): 2.4e-5 * 330,
    ("I", 633.0, 3e4, 1.5, "thermal", "J"): 3.9e-7 * 3e4,
    # k1(957.5) = 10^0.5; k2 = 1 at 1 s, 100 beyond 1e4 s
    ("I", 957.5, 1.0, 1.5, "thermal", "J"): 7e-4 * 10**0.5,
    ("I", 957.5, 3e4, 1.5, "thermal", "J"): 3.9e-5 * 10**0.5 * 3e4,
    # k2(750 nm, 2000 s) = 2000 x 51 / 10100
    ("I", 750.0, 2000.0, 1.5, "thermal", "J"): 3.9e-3 * 10 ** (50 / 515) * 2000 * 51 / 10100,
    # k1 = 100 up to 1e-7 s in 1535-1545 nm
    ("I", 1540.0, 1e-8, 1.5, "thermal", "J"): 7.9e-3,
    ("I", 1540.0, 1e-6, 1.5, "thermal", "J"): 4.4e-3 * 10**-1.5,
    ("I", 1550.0, 1e-8, 1.5, "thermal", "J"): 7.9e-5,
    ("I", 10600.0, 1.0, 1.5, "thermal", "J/m2"): 5600.0,
    ("IIa", 633.0, 2000.0, 1.5, "thermal", "J"): 7.8e-3,
    ("II", 633.0, 0.5, 1.5, "thermal", "J"): 5e-4,
    ("IIIa", 633.0, 0.5, 1.5, "thermal", "J"): 2.5e-3,
    ("IIIb", 307.4, 1.0, 1.5, "thermal", "J"): 1.5e-2,
    # 10 x (1e-6)^(1/3) = 0.1 J/cm2; never above 10 J/cm2: at 1064 nm 5 x 0.2^(1/3) x 10 = 29 is capped
    ("IIIb", 532.0, 1e-6, 1.5, "thermal", "J/m2"): 1e3,
    ("IIIb", 1064.0, 0.2, 1.5, "thermal", "J/m2"): 1e5,
    ("IIIb", 1064.0, 1.0, 1.5, "thermal", "J"): 0.5,
    ("IIIb", 10600.0, 1.0, 1.5, "thermal", "J/m2"): 1e5,
    ("IIIb", 10600.0, 10.0, 1.5, "thermal", "J"): 5.0,
}


@pytest.mark.parametrize(("scheme", "paper"), [(IEC, IEC_PAPER), (US, US_PAPER)], ids=SCHEMES)
def test_hand_worked_limits(scheme: str, paper: dict[tuple, float]) -> None:
    """Rows worked out on paper, so that not everything hangs on the plain implementation."""
    for (target, wavelength, t, alpha, effect, unit), dose in paper.items():
        rows = held(scheme, target, [(wavelength, t, alpha)])[0]
        found = [
            h.dose
            for h in rows
            if h.unit == unit and h.tissue != "anterior" and (scheme == US or h.effect == effect)
        ]
        assert found == [pytest.approx(dose, rel=EXACT, abs=0)], (target, wavelength, t, alpha)


def test_class_1_is_capped_at_class_3b_near_1400_nm() -> None:
    """1250-1400 nm: not above Class 3B, 0.15 J, then 0.5 W (IEC Tables 3 and 8, from memory)."""
    for t, dose in ((1e-10, 1.5e-2), (1e-3, 0.15), (100.0, 50.0)):
        for wavelength in (1250.0, 1310.0, JUST(1400.0, 0)):
            rows = held(IEC, "1", [(wavelength, t, 1.5)])[0]
            assert [h.dose for h in rows if h.tissue == "anterior"] == [pytest.approx(dose, rel=EXACT)]
        assert not any(h.tissue == "anterior" for h in held(IEC, "1", [(JUST(1250.0, 0), t, 1.5)])[0])


def test_classes_exist_in_their_bands_only() -> None:
    """Class 2: 400-700 nm; 3R from 302.5 nm on; IIa, II and IIIa: 400-710 nm (both schemes, from memory)."""
    absent = {
        IEC: {"2": (JUST(400, 0), 700.0, 1064.0), "3R": (180.0, JUST(302.5, 0))},
        US: {c: (JUST(400, 0), 710.01, 1064.0) for c in ("IIa", "II", "IIIa")},
    }
    present = {IEC: {"2": (400.0, JUST(700, 0)), "3R": (302.5, 1e6)}, US: {"II": (JUST(400, 401), 705.0)}}
    for scheme in SCHEMES:
        for there, bands in ((False, absent[scheme]), (True, present[scheme])):
            for target, wavelengths in bands.items():
                for found in held(scheme, target, [(w, 1.0, 1.5) for w in wavelengths]):
                    assert bool(found) == there, target


# At a wavelength where two printed bands of 21 CFR 1040.10(d) meet: the row whose upper end it is.
AT_UPPER_ENDS = {
    ("I", 400.0): {"I-180-400-1ns-day"},
    ("I", 1400.0): {"I-400-1400-20us-10s"},
    ("I", 2500.0): {"I-1400-2500-100ns-10s"},
    ("IIIb", 400.0): {"IIIb-180-400-250ms-day"},
    ("IIIb", 1400.0): {"IIIb-400-1400-250ms-day"},
    ("II", 400.0): set(),
    ("II", 710.0): {"II-400-710-250ms-day"},
}


def test_an_upper_end_belongs_to_its_band() -> None:
    """21 CFR 1040.10(d), Tables I to III-B (from memory): above 400 to 1400 nm, and so on."""
    for (target, wavelength), names in AT_UPPER_ENDS.items():
        assert {h.row for h in held(US, target, [(wavelength, 1.0, 1.5)])[0]} == names


@pytest.mark.parametrize(
    ("target", "row", "wavelength", "t", "dose"),
    [
        # k1 is 330.0 from above 315 nm to 400 nm included.
        ("I", "I-180-400-1ns-day", 400.0, 1.0, 2.4e-5 * 330),
        ("IIIb", "IIIb-180-400-250ms-day", 400.0, 10.0, 1.5e-3 * 330 * 10),
        # k1 is 5.0 and k2 is 100 beyond 1e4 s, from above 1060 nm to 1400 nm included.
        ("I", "I-400-1400-10000s-day", 1400.0, 3e4, 3.9e-7 * 5 * 100 * 3e4),
        # k1 is 100 up to 1e-7 s from above 1535 nm to 1545 nm included.
        ("I", "I-1400-1535-1ns-100ns", 1535.0, 1e-8, 7.9e-5),
        ("I", "I-1535-1545-1ns-100ns", 1545.0, 1e-8, 7.9e-3),
        # k1(315) = 10^((315 - 302.4) / 5), up to 315 nm included.
        ("I", "I-180-400-1ns-day", 315.0, 1.0, 2.4e-5 * 10 ** (12.6 / 5)),
    ],
)
def test_a_row_keeps_its_factors_at_its_upper_end(
    target: str, row: str, wavelength: float, t: float, dose: float
) -> None:
    """21 CFR 1040.10(d), Tables I, III-B and IV (from memory) print their bands with the upper end.

    A row that is judged at its end has the factors of its own band there, not those of the next one.
    """
    (found,) = (h.dose for h in held(US, target, [(wavelength, t, 1.5)])[0] if h.row == row)
    assert found == pytest.approx(dose, rel=EXACT)
