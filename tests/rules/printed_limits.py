"""The limit rows of the four documents, typed once more from the published numbers.

Typed by hand, not copied from data/. Wavelengths [nm], times [s], subtense [mrad]; H [J/m2], E [W/m2].
Choices of the product, not of the documents: ultraviolet steps given per whole nanometre hold up to
the next one; 302-303 nm takes 30 J/m2; times below 1 ns are split by tissue; rows that print the same
value twice (blue light beyond 100 s, 1400 nm and longer beyond 10 s) are one row.
"""

from __future__ import annotations

from typing import NamedTuple

from tests.rules.engine import ANSI, EU, ICNIRP, IEC

Time = float | str


class Printed(NamedTuple):
    """One printed limit. `factors` sorted; `subtense` (from, to) with None where unbounded."""

    tissue: str
    effect: str
    wavelength: tuple[float, float]
    time: tuple[Time, Time]
    quantity: str
    coefficient: float
    power: float
    factors: tuple[str, ...]
    subtense: tuple[float | None, float | None]
    cap: float | None
    source: str
    known: str


#: 303 to 314 nm: H of the step, and the end of the thermal row in 2006/25/EC Table 2.2.
STEPS = {
    303: (40, 2.6e-9), 304: (60, 1.3e-8), 305: (100, 1.0e-7), 306: (160, 6.7e-7), 307: (250, 4.0e-6),
    308: (400, 2.6e-5), 309: (630, 1.6e-4), 310: (1.0e3, 1.0e-3), 311: (1.6e3, 6.7e-3),
    312: (2.5e3, 4.0e-2), 313: (4.0e3, 2.6e-1), 314: (6.3e3, 1.6),
}  # fmt: skip
THERMAL, BLUE = "thermal", "photochemical"
DAY = 3e4
SMALL, WIDE, ANY = (None, 1.5), (1.5, None), (None, None)


def row(tissue, effect, wavelength, time, value, power=0.0, factors="", subtense=ANY, cap=None):
    """One row; `value` is "H 30" or "E 10"."""
    quantity, coefficient = value.split()
    return Printed(
        tissue, effect, wavelength, time, quantity, float(coefficient), power,
        tuple(sorted(factors.split())), subtense, cap, "", "",
    )  # fmt: skip


def as_skin(rows: list[Printed]) -> list[Printed]:
    return [r._replace(tissue="skin") for r in rows]


def stepped_uv() -> list[Printed]:
    """ICNIRP 2013 and ANSI Z136.1-2014 Table 5a, 180-400 nm, from memory."""
    return [
        row("cornea", THERMAL, (180, 303), (1e-13, 1e-9), "E 3e10"),
        row("cornea/lens", THERMAL, (303, 315), (1e-13, 1e-9), "E 3e10"),
        row("lens", THERMAL, (315, 400), (1e-13, 1e-9), "E 3e10"),
        row("cornea", BLUE, (180, 303), (1e-9, DAY), "H 30"),
        *(row("cornea/lens", BLUE, (n, n + 1), (1e-9, DAY), f"H {h}") for n, (h, _) in STEPS.items()),
        row("cornea/lens", THERMAL, (303, 315), (1e-9, 10), "H 5.6e3", 0.25),
        row("lens", THERMAL, (315, 400), (1e-9, 10), "H 5.6e3", 0.25),
        row("lens", BLUE, (315, 400), (10, DAY), "H 1e4"),
    ]


def eu_uv() -> list[Printed]:
    """2006/25/EC Table 2.2 (read) and Table 2.3 (from memory), 180-400 nm."""
    rows = [
        row("cornea", THERMAL, (180, 303), (1e-13, 1e-9), "E 3e10"),
        row("cornea/lens", THERMAL, (303, 315), (1e-13, 1e-9), "E 3e10"),
        row("lens", THERMAL, (315, 400), (1e-13, 1e-9), "E 3e10"),
        row("cornea", BLUE, (180, 303), (1e-9, 10), "H 30"),
        row("cornea", BLUE, (180, 303), (10, DAY), "H 30"),
        row("lens", THERMAL, (315, 400), (1e-9, 10), "H 5.6e3", 0.25),
        row("lens", BLUE, (315, 400), (10, DAY), "H 1e4"),
    ]
    for n, (h, end) in STEPS.items():
        rows.append(row("cornea/lens", THERMAL, (n, n + 1), (1e-9, end), "H 5.6e3", 0.25))
        rows.append(row("cornea/lens", BLUE, (n, n + 1), (end, 10), f"H {h}"))
        rows.append(row("cornea/lens", BLUE, (n, n + 1), (10, DAY), f"H {h}"))
    return rows


def iec_uv() -> list[Printed]:
    """IEC 60825-1:2014 Tables A.1, A.2, A.5, 180-400 nm, from memory."""
    return [
        row("cornea", THERMAL, (180, 302.5), (1e-13, 1e-9), "E 3e10"),
        row("cornea/lens", THERMAL, (302.5, 315), (1e-13, 1e-9), "E 3e10"),
        row("lens", THERMAL, (315, 400), (1e-13, 1e-9), "E 3e10"),
        row("cornea", BLUE, (180, 302.5), (1e-9, DAY), "H 30"),
        row("cornea/lens", THERMAL, (302.5, 315), (1e-9, "T1"), "H 1", 0, "C1"),
        row("cornea/lens", BLUE, (302.5, 315), ("T1", 10), "H 1", 0, "C2"),
        row("cornea/lens", BLUE, (302.5, 315), (10, DAY), "H 1", 0, "C2"),
        row("lens", THERMAL, (315, 400), (1e-9, 10), "H 1", 0, "C1"),
        row("lens", BLUE, (315, 400), (10, 1e3), "H 1e4"),
        row("lens", BLUE, (315, 400), (1e3, DAY), "E 10"),
    ]


def retina_2013(a: str, c: str, e: str) -> list[Printed]:
    """400-1400 nm, t < 10 s: ICNIRP 2013, IEC Tables A.1/A.2, ANSI Tables 5b-5d, from memory."""
    rows = []
    for band, factor in (((400, 700), ""), ((700, 1050), a)):
        rows += [
            row("retina", THERMAL, band, (1e-13, 1e-11), "H 1e-3", 0, f"{factor} {e}"),
            row("retina", THERMAL, band, (1e-11, 5e-6), "H 2e-3", 0, f"{factor} {e}"),
            row("retina", THERMAL, band, (5e-6, 10), "H 18", 0.75, f"{factor} {e}"),
        ]
    return [
        *rows,
        row("retina", THERMAL, (1050, 1400), (1e-13, 1e-11), "H 1e-2", 0, f"{c} {e}"),
        row("retina", THERMAL, (1050, 1400), (1e-11, 1.3e-5), "H 2e-2", 0, f"{c} {e}"),
        row("retina", THERMAL, (1050, 1400), (1.3e-5, 10), "H 90", 0.75, f"{c} {e}"),
    ]


def retina_eu() -> list[Printed]:
    """2006/25/EC Table 2.2, 400-1400 nm, t < 10 s, read."""
    rows = []
    for band, factor in (((400, 700), ""), ((700, 1050), "C_A")):
        rows += [
            row("retina", THERMAL, band, (1e-13, 1e-11), "H 1.5e-4", 0, f"{factor} C_E"),
            row("retina", THERMAL, band, (1e-11, 1e-9), "H 2.7e4", 0.75, f"{factor} C_E"),
            row("retina", THERMAL, band, (1e-9, 1.8e-5), "H 5e-3", 0, f"{factor} C_E"),
            row("retina", THERMAL, band, (1.8e-5, 10), "H 18", 0.75, f"{factor} C_E"),
        ]
    return [
        *rows,
        row("retina", THERMAL, (1050, 1400), (1e-13, 1e-11), "H 1.5e-3", 0, "C_C C_E"),
        row("retina", THERMAL, (1050, 1400), (1e-11, 1e-9), "H 2.7e5", 0.75, "C_C C_E"),
        row("retina", THERMAL, (1050, 1400), (1e-9, 5e-5), "H 5e-2", 0, "C_C C_E"),
        row("retina", THERMAL, (1050, 1400), (5e-5, 10), "H 90", 0.75, "C_C C_E"),
    ]


def long_band(band, small, wide, factors, e, cap=None):
    """t >= 10 s for one band: small source, extended to T2, extended beyond T2."""
    return [
        row("retina", THERMAL, band, (10, DAY), f"E {small}", 0, factors, SMALL),
        row("retina", THERMAL, band, (10, "T2"), f"H {wide}", 0.75, f"{factors} {e}", WIDE),
        row("retina", THERMAL, band, ("T2", DAY), f"E {wide}", 0, f"{factors} {e} T2^-0.25", WIDE, cap),
    ]


def blue_light(b: str) -> list[Printed]:
    """400-600 nm photochemical; the field angle enters as F_gamma. All sets, from memory."""
    return [
        row("retina", BLUE, (400, 600), (10, 100), "H 100", 0, f"{b} F_gamma"),
        row("retina", BLUE, (400, 600), (100, DAY), "E 1", 0, f"{b} F_gamma"),
    ]


def infrared() -> list[Printed]:
    """1400 nm to 1 mm, the same numbers in all four documents."""

    def cornea(band, time, value, power=0.0):
        return row("cornea", THERMAL, band, time, value, power)

    return [
        cornea((1400, 1500), (1e-13, 1e-9), "E 1e12"),
        cornea((1400, 1500), (1e-9, 1e-3), "H 1e3"),
        cornea((1400, 1500), (1e-3, 10), "H 5.6e3", 0.25),
        cornea((1500, 1800), (1e-13, 1e-9), "E 1e13"),
        cornea((1500, 1800), (1e-9, 10), "H 1e4"),
        cornea((1800, 2600), (1e-13, 1e-9), "E 1e12"),
        cornea((1800, 2600), (1e-9, 1e-3), "H 1e3"),
        cornea((1800, 2600), (1e-3, 10), "H 5.6e3", 0.25),
        cornea((2600, 1e6), (1e-13, 1e-9), "E 1e11"),
        cornea((2600, 1e6), (1e-9, 1e-7), "H 100"),
        cornea((2600, 1e6), (1e-7, 10), "H 5.6e3", 0.25),
        cornea((1400, 1e6), (10, DAY), "E 1000"),
    ]


def skin_band(tissue, band, factors=""):
    """Skin numbers of 400-1400 nm, the same in all four documents."""
    return [
        row(tissue, THERMAL, band, (1e-13, 1e-9), "E 2e11", 0, factors),
        row(tissue, THERMAL, band, (1e-9, 1e-7), "H 200", 0, factors),
        row(tissue, THERMAL, band, (1e-7, 10), "H 1.1e4", 0.25, factors),
        row(tissue, THERMAL, band, (10, DAY), "E 2e3", 0, factors),
    ]


def known_as(rows: list[Printed], source: str, known: str) -> list[Printed]:
    return [r._replace(source=source, known=known) for r in rows]


def icnirp() -> list[Printed]:
    """ICNIRP 2013, Health Physics 105(3):271-295: from memory."""
    return known_as(
        [
            *stepped_uv(),
            *retina_2013("C_A", "C_C", "C_E"),
            *long_band((400, 700), "10", "18", "", "C_E"),
            *long_band((700, 1400), "10", "18", "C_A C_C", "C_E"),
            *blue_light("C_B"),
            *skin_band("anterior", (1250, 1400), "C_A"),
            *infrared(),
            *as_skin(stepped_uv()),
            *skin_band("skin", (400, 700)),
            *skin_band("skin", (700, 1400), "C_A"),
            *as_skin(infrared()),
        ],
        ICNIRP,
        "memory",
    )


def iec() -> list[Printed]:
    """IEC 60825-1:2014 Annex A: from memory."""
    return known_as(
        [
            *iec_uv(),
            *retina_2013("C4", "C7", "C6"),
            *long_band((400, 700), "10", "18", "", "C6"),
            *long_band((700, 1400), "10", "18", "C4 C7", "C6"),
            *blue_light("C3"),
            *skin_band("anterior", (1250, 1400), "C4"),
            *infrared(),
            *as_skin(iec_uv()),
            *skin_band("skin", (400, 700)),
            *skin_band("skin", (700, 1400), "C4"),
            *as_skin(infrared()),
        ],
        IEC,
        "memory",
    )


def eu() -> list[Printed]:
    """2006/25/EC Annex II: Tables 2.2 and 2.4 read in the French code, Table 2.3 from memory."""
    rows = [
        *eu_uv(),
        *retina_eu(),
        *long_band((400, 700), "10", "18", "", "C_E"),
        *long_band((700, 1400), "10", "18", "C_A C_C", "C_E", cap=1000.0),
        *blue_light("C_B"),
        *infrared(),
        *as_skin(eu_uv()),
        *as_skin(infrared()),
    ]
    own = [
        row("skin", THERMAL, (400, 700), (1e-13, 1e-9), "E 2e11"),
        row("skin", THERMAL, (700, 1400), (1e-13, 1e-9), "E 2e11", 0, "C_A"),
        row("skin", THERMAL, (400, 1400), (1e-9, 1e-7), "H 200", 0, "C_A"),
        row("skin", THERMAL, (400, 1400), (1e-7, 10), "H 1.1e4", 0.25, "C_A"),
        row("skin", THERMAL, (400, 1400), (10, DAY), "E 2e3", 0, "C_A"),
    ]
    late = [r for r in rows if isinstance(r.time[0], str) or r.time[0] >= 10]
    early = [r for r in rows if r not in late]
    return known_as([*early, *own], "code-du-travail-fr", "read") + known_as(late, EU, "memory")


def ansi() -> list[Printed]:
    """ANSI Z136.1-2014: from memory, but for the skin rows 400-1400 nm read in a manual.

    Product choices: below 1 ns the irradiance of the 1 ns limit; 1200-1400 nm takes the stricter
    corneal rows of 1400-1500 nm as a second limit.
    """
    stand_in = [
        r._replace(tissue="anterior", wavelength=(1200, 1400))
        for r in infrared()
        if r.wavelength == (1400, 1500) or r.time[0] == 10
    ]
    skin_uv = as_skin([r for r in stepped_uv() if not (r.wavelength == (315, 400) and r.time[0] == 10)])
    skin = skin_band("skin", (400, 1400), "C_A")
    from_memory = [
        *stepped_uv(),
        *retina_2013("C_A", "C_C", "C_E"),
        *long_band((400, 700), "10", "18", "", "C_E"),
        *long_band((700, 1050), "10", "18", "C_A", "C_E"),
        *long_band((1050, 1400), "50", "90", "C_C", "C_E"),
        *blue_light("C_B"),
        *stand_in,
        *infrared(),
        *skin_uv,
        row("skin", BLUE, (315, 400), (10, 1e3), "H 1e4"),
        row("skin", BLUE, (315, 400), (1e3, DAY), "E 10"),
        skin[0],
        *as_skin(infrared()),
    ]
    return known_as(from_memory, ANSI, "memory") + known_as(skin[1:], "instrument-manual-ansi-skin", "read")


LIMITS = {ICNIRP: icnirp(), EU: eu(), IEC: iec(), ANSI: ansi()}
