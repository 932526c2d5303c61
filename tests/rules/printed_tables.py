"""Factors, apertures, durations, repetition and additivity, typed once more from the published numbers.

Typed by hand, not copied from data/. A factor row is (factor, unit, variable, from, to, offset, coefficient,
slope, origin, per, power); None where the form does not need it.
"""

from __future__ import annotations

from itertools import pairwise

from tests.rules.engine import ANSI, EU, ICNIRP, IEC

FR = "code-du-travail-fr"
NM, S, MRAD = "wavelength_nm", "time_s", "subtense_mrad"
DAY = 3e4


def piece(name, unit, variable, band, value, ten=None, power=None, offset=0.0):
    """One piece; `ten` is (slope, origin, per) of a power of ten."""
    slope, origin, per = ten or (None, None, None)
    return (name, unit, variable, *map(_f, band), offset, float(value), *map(_f, (slope, origin, per, power)))


def _f(x: float | None) -> float | None:
    return None if x is None else float(x)


def spectral(a: str, b: str, c: str, c_from: float, c_last: dict, b_to: float) -> list[tuple]:
    """C_A, C_B, C_C (C4, C3, C7)."""
    return [
        piece(a, "1", NM, (400, 700), 1),
        piece(a, "1", NM, (700, 1050), 1, (0.002, 700, None)),
        piece(a, "1", NM, (1050, 1400), 5),
        piece(b, "1", NM, (400, 450), 1),
        piece(b, "1", NM, (450, b_to), 1, (0.02, 450, None)),
        piece(c, "1", NM, (c_from, 1150), 1),
        piece(c, "1", NM, (1150, 1200), 1, (0.018, 1150, None)),
        piece(c, "1", NM, (1200, 1400), **c_last),
    ]


def source_size(gamma: str, gamma_from: float, eu: bool) -> list[tuple]:
    """alpha_min, alpha_max, T2 and the photochemical field angle."""
    widest = (
        [piece("alpha_max", "mrad", S, (1e-13, DAY), 100)]
        if eu
        else [
            piece("alpha_max", "mrad", S, (1e-13, 625e-6), 5),
            piece("alpha_max", "mrad", S, (625e-6, 0.25), 200, power=0.5),
            piece("alpha_max", "mrad", S, (0.25, DAY), 100),
        ]
    )
    return [
        piece("alpha_min", "mrad", S, (1e-13, DAY), 1.5),
        *widest,
        piece("T2", "s", MRAD, (0, 1.5), 10),
        piece("T2", "s", MRAD, (1.5, 100), 10, (1, 1.5, 98.5)),
        piece("T2", "s", MRAD, (100, None), 100),
        piece(gamma, "mrad", S, (gamma_from, 100), 11),
        piece(gamma, "mrad", S, (100, 1e4), 1.1, power=0.5),
        piece(gamma, "mrad", S, (1e4, DAY), 110),
    ]


def grouping(name: str, visible: float, near: float) -> list[tuple]:
    """T_i (T_min, t_min) from 400 nm."""
    ends = (400, 1050, 1400, 1500, 1800, 2600, 1e6)
    values = (visible, near, 1e-3, 10, 1e-3, 1e-7)
    return [piece(name, "s", NM, band, v) for band, v in zip(pairwise(ends), values, strict=True)]


RISING_C = {"value": 1, "ten": (0.04, 1250, None), "offset": 8.0}
BLUE_BREAK = piece("T1", "s", NM, (450, 500), 10, (0.02, 450, None))

#: ICNIRP 2013 from memory; IEC 60825-1:2014 Table 9, 4.3 c) and Table 2 from memory; ANSI Z136.1-2014
#: Table 6 from memory; 2006/25/EC Tables 2.5 and 2.6 read in the French code.
FACTORS = {
    ICNIRP: [
        *spectral("C_A", "C_B", "C_C", 700, RISING_C, 600),
        *source_size("gamma", 10, eu=False),
        BLUE_BREAK,
        *grouping("T_i", 5e-6, 1.3e-5),
    ],
    EU: [
        *spectral("C_A", "C_B", "C_C", 700, {"value": 8}, 700),
        *source_size("gamma", 1e-13, eu=True),
        piece("T1", "s", NM, (400, 450), 10),
        BLUE_BREAK,
        piece("T1", "s", NM, (500, 600), 100),
        piece("T_min", "s", NM, (315, 400), 1e-9),
        *grouping("T_min", 18e-6, 50e-6),
    ],
    IEC: [
        piece("C1", "J/m2", S, (1e-13, DAY), 5.6e3, power=0.25),
        piece("C2", "J/m2", NM, (302.5, 315), 1, (0.2, 295, None)),
        piece("T1", "s", NM, (302.5, 315), 1e-15, (0.8, 295, None)),
        *spectral("C4", "C3", "C7", 700, RISING_C, 600),
        *source_size("gamma_ph", 10, eu=False),
        *grouping("T_i", 5e-6, 1.3e-5),
    ],
    ANSI: [
        *spectral("C_A", "C_B", "C_C", 1050, RISING_C, 600),
        *source_size("gamma", 10, eu=False),
        BLUE_BREAK,
        *grouping("t_min", 5e-6, 1.3e-5),
    ],
}
FACTOR_SOURCE = {ICNIRP: (ICNIRP, "memory"), EU: (FR, "read"), IEC: (IEC, "memory"), ANSI: (ANSI, "memory")}


def graded(tissue: str, band: tuple[float, float], first: float) -> list[tuple]:
    """1 mm, 1.5 t^0.375 mm, 3.5 mm; the first break at 0.35 s or 0.3 s."""
    return [
        ("eye", tissue, *map(float, band), 1e-13, first, 1.0, 0.0),
        ("eye", tissue, *map(float, band), first, 10.0, 1.5, 0.375),
        ("eye", tissue, *map(float, band), 10.0, DAY, 3.5, 0.0),
    ]


def fixed(target: str, tissue: str, band: tuple[float, float], mm: float) -> tuple:
    return (target, tissue, *map(float, band), 1e-13, DAY, mm, 0.0)


RETINA, FAR = fixed("eye", "retina", (400, 1400), 7.0), fixed("eye", "*", (1e5, 1e6), 11.0)
SKINS = [fixed("skin", "*", (180, 1e5), 3.5), fixed("skin", "*", (1e5, 1e6), 11.0)]

#: (target, tissue, from nm, to nm, from s, to s, mm, power). ICNIRP 2013 and ANSI Table 8a from memory;
#: IEC Table A.6 from memory (same numbers read in BGV B2 Tabelle 5); 2006/25/EC Tables 2.2 and 2.4 read,
#: 3.5 mm of Table 2.3 from memory. The anterior criterion takes the aperture of the limit it borrows.
APERTURES = {
    ICNIRP: [
        *graded("*", (180, 400), 0.35), *graded("*", (1400, 1e5), 0.35), RETINA, FAR,
        fixed("eye", "anterior", (1250, 1400), 3.5), *SKINS,
    ],
    EU: [
        *graded("*", (180, 400), 0.3), *graded("*", (1400, 1e5), 0.3), RETINA, FAR,
        fixed("skin", "*", (180, 1e6), 3.5),
    ],
    IEC: [
        fixed("eye", "*", (180, 400), 1.0), *graded("*", (1400, 1e5), 0.35), RETINA, FAR,
        fixed("eye", "anterior", (1250, 1400), 3.5), *SKINS,
    ],
    ANSI: [
        *graded("*", (180, 400), 0.3), *graded("*", (1400, 1e5), 0.3), RETINA, FAR,
        *graded("anterior", (1200, 1400), 0.3), *SKINS,
    ],
}  # fmt: skip


def durations(infrared_s: float) -> list[tuple]:
    """(kind, from nm, to nm, seconds). Read: TROS Laserstrahlung part 2, 4.1 (30 000, 0.25, 2, 100 s).

    10 s (near infrared) and 600 s (diffuse viewing) are US practice, from memory.
    """
    return [
        ("default", 180.0, 400.0, 3e4),
        ("default", 400.0, 700.0, 0.25),
        ("default", 700.0, 1e6, infrared_s),
        ("choice", 400.0, 700.0, 0.25),
        ("choice", 400.0, 700.0, 2.0),
        ("choice", 400.0, 1e6, 10.0),
        ("choice", 400.0, 1e6, 100.0),
        ("choice", 400.0, 700.0, 600.0),
        ("choice", 180.0, 1e6, 3e4),
    ]


DURATIONS = {ICNIRP: durations(100.0), EU: durations(100.0), IEC: durations(100.0), ANSI: durations(10.0)}


def rep(pulse, exposure, subtense, count, coefficient, power=0.0, floor=None):
    """One row for retinal thermal limits: bands (from, to], None where unbounded."""
    return ("eye", "retina", "thermal", pulse, *exposure, *subtense, *count, coefficient, power, floor)


NONE = (None, None)
LARGE = rep("any", NONE, (100.0, None), NONE, 1.0)
LONG = [
    rep("long", NONE, (None, 5.0), NONE, 1.0),
    rep("long", NONE, (5.0, "alpha_max"), (None, 40.0), 1.0, -0.25),
    rep("long", NONE, (5.0, "alpha_max"), (40.0, None), 0.4),
    rep("long", NONE, ("alpha_max", 100.0), (None, 625.0), 1.0, -0.25),
    rep("long", NONE, ("alpha_max", 100.0), (625.0, None), 0.2),
]


def short(up_to_mrad: float) -> list[tuple]:
    """Pulses no longer than T_i: 1 up to 0.25 s or 600 pulses, then 5 N^-0.25, at least 0.4."""
    size = (None, up_to_mrad)
    return [
        rep("short", (None, 0.25), size, NONE, 1.0),
        rep("short", (0.25, None), size, (None, 600.0), 1.0),
        rep("short", (0.25, None), size, (600.0, None), 5.0, -0.25, 0.4),
    ]


#: ICNIRP 2013, IEC 4.3 f) and ANSI 8.2.3 from memory; 2006/25/EC Table 2.6 read. ANSI, pulses up to
#: t_min: not remembered; the stricter of the size rule and the ICNIRP rule (product choice).
REPETITION = {
    ICNIRP: [LARGE, *short(100.0), *LONG],
    EU: [("*", "*", "thermal", "any", *NONE, *NONE, *NONE, 1.0, -0.25, None)],
    IEC: [LARGE, *short(100.0), *LONG],
    ANSI: [
        LARGE,
        *short(5.0),
        rep("short", NONE, (5.0, 100.0), (None, 625.0), 1.0, -0.25),
        rep("short", NONE, (5.0, 100.0), (625.0, None), 0.2),
        *LONG,
    ],
}

#: BGI 832 Tabelle 1 (the IEC additivity table): read. (band, with band, eye adds, skin adds).
UVC, UVA, NEAR, FAR_IR = (180.0, 315.0), (315.0, 400.0), (400.0, 1400.0), (1400.0, 1e6)
ADDITIVITY = {
    (UVC, UVC): (True, True),
    (UVA, UVA): (True, True),
    (UVA, NEAR): (False, True),
    (UVA, FAR_IR): (True, True),
    (NEAR, NEAR): (True, True),
    (NEAR, FAR_IR): (False, True),
    (FAR_IR, FAR_IR): (True, True),
    (UVC, UVA): (False, False),
    (UVC, NEAR): (False, False),
    (UVC, FAR_IR): (False, False),
}
