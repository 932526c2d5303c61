"""The bands tile wavelength x time: no gap, no overlap that is not printed, every boundary on its side.

Worked out from the CSV files with plain comparisons, not with the loader's own check, on a sample that
holds every boundary and the floats next to it. Then the engine is asked at every point of the sample.
Which rows may meet where is written from the published tables: ICNIRP 2013, IEC 60825-1:2014 Annex A and
ANSI Z136.1-2014 from memory, 2006/25/EC Annex II read (Table 2.3 from memory).
"""

from __future__ import annotations

import math
from functools import cache
from itertools import pairwise

import numpy as np
import pytest
from numpy.typing import NDArray

from tests.rules.engine import ANSI, EU, IEC, LAST_NM, LAST_S, RULES, TARGETS, head, row_numbers, table

JUST = math.nextafter
ALPHAS = (0.5, 1.5, JUST(1.5, 2), 21.2, 100.0, 150.0)

#: Boundaries of 2006/25/EC that two printed rows share (note a, read). The whole-nanometre steps and T2
#: are not shared: the steps are printed for single wavelengths.
SHARED_NM = (400, 600, 700, 1050, 1400, 1500, 1800, 2600)
SHARED_S = (
    1e-11, 1e-9, 2.6e-9, 1.3e-8, 1e-7, 6.7e-7, 4e-6, 1.8e-5, 2.6e-5, 5e-5, 1.6e-4, 1e-3, 6.7e-3, 4e-2,
    2.6e-1, 1.6, 10, 100,
)  # fmt: skip

Bools = NDArray[np.bool_]
Floats = NDArray[np.float64]


def shared(rules: str) -> tuple[tuple[float, ...], tuple[float, ...]]:
    return (SHARED_NM, SHARED_S) if rules == EU else ((), ())


def sample(edges: set[float], low: float, high: float) -> Floats:
    """Every boundary, the floats beside it and two points between each pair, within the range."""
    ordered = sorted(edges)
    points = {e for b in ordered for e in (JUST(b, 0), b, JUST(b, math.inf))}
    for a, b in pairwise(ordered):
        points |= {math.sqrt(a * b), a + (b - a) * 0.7}
    return np.array(sorted(p for p in points if low <= p <= high))


@cache
def axes(rules: str) -> tuple[Floats, Floats]:
    """Sample of wavelength [nm] and time [s]; factor edges and the aperture breaks are boundaries too."""
    wavelengths, times = {180.0, LAST_NM}, {1e-13, LAST_S}
    for name in ("limits", "apertures"):
        for r in table(rules, name):
            wavelengths |= {float(r["wavelength_from_nm"]), float(r["wavelength_to_nm"])}
            times |= {float(r[c]) for c in ("time_from_s", "time_to_s") if r[c] not in ("T1", "T2")}
    for r in table(rules, "factors"):
        if r["variable"] == "wavelength_nm":
            wavelengths |= {float(r["from"]), float(r["to"])}
    t2 = {10 * 10 ** ((a - 1.5) / 98.5) for a in ALPHAS if 1.5 < a < 100}
    return sample(wavelengths, 180.0, LAST_NM), sample(times | t2, 1e-13, LAST_S)


def breaks(wavelength: Floats, alpha: float) -> dict[str, Floats]:
    """T1 (IEC, 302.5-315 nm) and T2 [s] as printed."""
    within = np.clip(wavelength, 302.5, 315)
    t2 = 10.0 if alpha <= 1.5 else 100.0 if alpha > 100 else 10 * 10 ** ((alpha - 1.5) / 98.5)
    return {"T1": 1e-15 * 10 ** (0.8 * (within - 295)), "T2": np.full(wavelength.shape, t2)}


def holds(row: dict[str, str], rules: str, w: Floats, t: Floats, alpha: float) -> Bools:
    """Whether a CSV row holds at each (w, t): lower <= x < upper, closed at the last end or where shared."""
    nm, s = shared(rules)
    low, high = float(row["wavelength_from_nm"]), float(row["wavelength_to_nm"])
    closed = high == LAST_NM or high in nm
    found = (w >= low) & ((w <= high) if closed else (w < high))
    named = breaks(w, alpha)
    start, end = row["time_from_s"], row["time_to_s"]
    found &= t >= (named[start] if start in named else float(start))
    if end in named:
        found &= t < named[end]
    else:
        found &= (t <= float(end)) if float(end) in (*s, LAST_S) else (t < float(end))
    if row["subtense_to_mrad"] and not alpha <= float(row["subtense_to_mrad"]):
        found[:] = False
    if row["subtense_from_mrad"] and not alpha > float(row["subtense_from_mrad"]):
        found[:] = False
    return found


@cache
def grid(rules: str) -> tuple[Floats, Floats]:
    """The whole sample as two flat arrays; T1 is passed by 1e-9 of itself on both sides."""
    wavelength, time = axes(rules)
    w, t = (a.ravel() for a in np.meshgrid(wavelength, time, indexing="ij"))
    if rules == IEC:
        uv = wavelength[(wavelength >= 302.5) & (wavelength < 315)]
        t1 = breaks(uv, 1.5)["T1"]
        near = np.concatenate([t1 * (1 - 1e-9), t1 * (1 + 1e-9)])
        keep = near >= 1e-9
        w, t = np.concatenate([w, np.tile(uv, 2)[keep]]), np.concatenate([t, near[keep]])
    return w, t


@cache
def held_by_csv(rules: str, target: str, alpha: float) -> dict[str, Bools]:
    w, t = grid(rules)
    rows = [r for r in table(rules, "limits") if r["target"] == target]
    return {r["row"]: holds(r, rules, w, t, alpha) for r in rows}


def count(rules: str, target: str, alpha: float, tissue: str | None, effect: str) -> NDArray[np.int64]:
    """How many rows of a tissue (None: any) and effect hold at each point of the sample."""
    found = held_by_csv(rules, target, alpha)
    total = np.zeros(grid(rules)[0].shape, dtype=np.int64)
    for r in table(rules, "limits"):
        if r["target"] == target and r["effect"] == effect and tissue in (None, r["tissue"]):
            total += found[r["row"]]
    return total


def printed_counts(rules: str, w: Floats, t: Floats) -> dict[tuple[str, str], Bools]:
    """Where the documents have exactly one row of a tissue and effect (away from shared boundaries)."""
    end = 302.5 if rules == IEC else 303
    blue_from = 1e-9
    uv = w < 400
    # Thermal until 10 s and photochemical beyond (315-400 nm); one photochemical row from 1 ns up to `end`;
    # between them both at once (whole-nanometre sets), or one after the other (2006/25/EC, IEC).
    steps = (w >= end) & (w < 315)
    a = (w >= 315) & uv
    thermal_step = steps & (t < 10)
    blue_step = steps & (t >= blue_from)
    if rules == IEC:
        t1 = breaks(w, 1.5)["T1"]
        thermal_step, blue_step = steps & (t < t1), steps & (t >= np.maximum(t1, blue_from))
    if rules == EU:
        break_s = np.full(w.shape, math.inf)
        for n, s in enumerate(
            (2.6e-9, 1.3e-8, 1e-7, 6.7e-7, 4e-6, 2.6e-5, 1.6e-4, 1e-3, 6.7e-3, 4e-2, 0.26, 1.6)
        ):
            break_s[np.floor(w) == 303 + n] = s
        thermal_step, blue_step = steps & (t < break_s), steps & (t >= break_s)
    far, near = w >= 1400, (w >= 400) & (w < 1400)
    found = {
        ("cornea", "thermal"): ((w < end) & (t < 1e-9)) | far,
        ("cornea", "photochemical"): (w < end) & (t >= blue_from),
        ("cornea/lens", "thermal"): thermal_step,
        ("cornea/lens", "photochemical"): blue_step,
        ("lens", "thermal"): a & (t < 10),
        ("lens", "photochemical"): a & (t >= 10),
        ("retina", "thermal"): near,
        ("retina", "photochemical"): (w >= 400) & (w < 600) & (t >= 10),
        ("anterior", "thermal"): (w >= (1200 if rules == ANSI else 1250)) & (w < 1400) & (rules != EU),
    }
    uv_thermal = found["cornea", "thermal"] & uv | thermal_step | found["lens", "thermal"]
    uv_blue = found["cornea", "photochemical"] | blue_step | found["lens", "photochemical"]
    return {**found, ("skin", "thermal"): uv_thermal | near | far, ("skin", "photochemical"): uv_blue}


@pytest.mark.parametrize("alpha", ALPHAS)
@pytest.mark.parametrize("rules", RULES)
def test_exactly_the_printed_rows_hold_everywhere(rules: str, alpha: float) -> None:
    """One row of a tissue and effect where the documents have one, none elsewhere: no gap, no overlap."""
    w, t = grid(rules)
    nm, s = shared(rules)
    inside = ~(np.isin(w, nm) | np.isin(t, s))
    for (tissue, effect), printed in printed_counts(rules, w, t).items():
        target = "skin" if tissue == "skin" else "eye"
        found = count(rules, target, alpha, tissue, effect)
        wrong = np.flatnonzero((found != printed) & inside)
        assert not wrong.size, (tissue, effect, w[wrong[:3]], t[wrong[:3]], found[wrong[:3]])


@pytest.mark.parametrize("target", TARGETS)
@pytest.mark.parametrize("rules", RULES)
def test_every_point_has_a_limit(rules: str, target: str) -> None:
    """No hole for eye or skin, small or extended source, boundaries of all kinds included."""
    for alpha in ALPHAS:
        total = sum(count(rules, target, alpha, None, effect) for effect in ("thermal", "photochemical"))
        assert (total >= 1).all()


def check_neighbours(rules: str, row: dict[str, str], held_at: Bools, alpha: float) -> None:
    """At each boundary the row holds as at the float above; where shared as at either; at the end as below.

    T1 and T2 are no printed boundaries: a point within 1e-9 of T1 is left out, and the end of a T2 row is
    not shared.
    """
    wavelength, time = axes(rules)
    nm, s = shared(rules)
    block = held_at[: len(wavelength) * len(time)].reshape(len(wavelength), len(time))
    free = np.ones(block.shape, dtype=bool)
    if "T1" in (row["time_from_s"], row["time_to_s"]):
        free = abs(time[None, :] / breaks(wavelength, alpha)["T1"][:, None] - 1) > 1e-9
    if row["time_to_s"] == "T2":
        s = ()
    for axis, values, both, last in ((0, wavelength, nm, LAST_NM), (1, time, s, LAST_S)):
        lines, counts = np.moveaxis(block, axis, 0), np.moveaxis(free, axis, 0)
        for k in range(1, len(values) - 1):
            if values[k - 1] != JUST(values[k], 0) or values[k + 1] != JUST(values[k], math.inf):
                continue
            below, above = lines[k - 1], lines[k + 1]
            expected = below | above if values[k] in both else above
            assert not ((lines[k] != expected) & counts[k]).any(), (row["row"], values[k])
        assert values[-1] == last
        assert (lines[-1] == lines[-2]).all(), (row["row"], last)


@pytest.mark.parametrize("target", TARGETS)
@pytest.mark.parametrize("rules", RULES)
def test_every_boundary_belongs_to_the_upper_band(rules: str, target: str) -> None:
    """lower <= x < upper; 2006/25/EC note a: both rows at a shared boundary."""
    for alpha in (1.5, 21.2, 150.0):
        found = held_by_csv(rules, target, alpha)
        for r in table(rules, "limits"):
            if r["target"] == target:
                check_neighbours(rules, r, found[r["row"]], alpha)


@pytest.mark.parametrize("alpha", ALPHAS)
@pytest.mark.parametrize("target", TARGETS)
@pytest.mark.parametrize("rules", RULES)
def test_the_engine_holds_the_same_rows(rules: str, target: str, alpha: float) -> None:
    """At every point of the sample the engine finds exactly the rows of the CSV file."""
    w, t = grid(rules)
    _, rows = row_numbers(rules, target, w, t, np.full(w.shape, alpha))
    names = [r["row"] for r in table(rules, "limits")]
    slots = np.where(rows >= 0, rows, len(names))
    found = np.zeros((len(w), len(names) + 1), dtype=np.int16)
    np.add.at(found, (np.arange(len(w))[:, None], slots), 1)
    for name, mask in held_by_csv(rules, target, alpha).items():
        mine = found[:, names.index(name)]
        wrong = np.flatnonzero(mine != mask)
        assert not wrong.size, (name, w[wrong[:3]], t[wrong[:3]])
    other = [k for k, r in enumerate(table(rules, "limits")) if r["target"] != target]
    assert not found[:, other].any()


def test_the_shared_boundaries_are_those_of_the_document() -> None:
    """2006/25/EC: every printed band end of Tables 2.2-2.4, and the factor edges of Table 2.5."""
    named = head(EU)["shared_boundaries"]
    assert tuple(named["time_s"]) == SHARED_S
    assert set(named["wavelength_nm"]) == {*SHARED_NM, 450, 1150, 1200}
    for rules in RULES:
        assert (rules == EU) == ("shared_boundaries" in head(rules))


@pytest.mark.parametrize("rules", RULES)
def test_the_sample_holds_every_boundary_and_its_neighbours(rules: str) -> None:
    wavelength, time = (set(a.tolist()) for a in axes(rules))
    outside = {JUST(180.0, 0), JUST(LAST_NM, math.inf), JUST(1e-13, 0), JUST(LAST_S, math.inf)}
    for r in table(rules, "limits"):
        for name, points in (("wavelength_{}_nm", wavelength), ("time_{}_s", time)):
            for b in (r[name.format("from")], r[name.format("to")]):
                if b not in ("T1", "T2"):
                    x = float(b)
                    assert {x, JUST(x, 0), JUST(x, math.inf)} - points <= outside, (r["row"], b)
