"""The worst case over a box of figures: known directions where they are proven, a search where not.

More power or energy never lowers a ratio; a wider or faster spreading beam never raises one where the
waist's place is fixed. Those figures go to their worse end. The others (wavelength, durations, rate,
subtense, place of the waist) can turn either way where a table changes its row, so they are tried at both
ends, at every printed boundary between, on both sides of it, and at places in between.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from itertools import product

import numpy as np
from numpy.typing import NDArray

from service.assess.spread import Knob, Nominal
from service.rules.limit_set import LimitSet
from service.rules.tables import FactorRow

__all__ = ["CORNERS", "breaks", "corner_values", "direction"]

Floats = NDArray[np.float64]

#: Most corners tried; beyond that as many are drawn at random from all there are.
CORNERS = 20_000
BETWEEN = 7
UP = ("emitted", "average_power_w")
DOWN = ("diameter_x", "diameter_y", "divergence_x", "divergence_y")
COLUMNS = {
    "wavelength_nm": ("wavelength_from_nm", "wavelength_to_nm"),
    "time_s": ("time_from_s", "time_to_s", "exposure_from_s", "exposure_to_s", "duration_s"),
    "subtense_mrad": ("subtense_from_mrad", "subtense_to_mrad"),
}


def direction(knob: Knob, nominal: Sequence[Nominal], turned: Iterable[Knob]) -> int:
    """1 where more is never safer, -1 where less is never safer, 0 where neither is proven."""
    if knob.figure in UP:
        return 1
    if knob.figure in DOWN:
        moves = Knob(knob.line, "waist_m") in set(turned)
        given = nominal[knob.line]
        fixed = not moves and (not given.at_exit or given.waist_m == 0.0)
        return -1 if fixed else 0
    return 0


def breaks(sets: Sequence[LimitSet], variable: str) -> Floats:
    """Every printed boundary of a variable in the tables of some rule sets and schemes, ascending."""
    found = {1.5} if variable == "subtense_mrad" else set()
    for rules in sets:
        for name in rules.__dataclass_fields__:
            table = getattr(rules, name)
            for row in table if isinstance(table, tuple) else ():
                ends: list[object] = [getattr(row, c, None) for c in COLUMNS[variable]]
                if isinstance(row, FactorRow) and row.variable == variable:
                    ends = [row.from_, row.to]
                found |= {float(v) for v in ends if isinstance(v, int | float)}
    return np.array(sorted(found))


def _candidates(knob: Knob, low: float, high: float, nominal: float, printed: Mapping[str, Floats]) -> Floats:
    """Values at which a figure without a proven direction is tried."""
    values = [low, high, nominal]
    variable = "time_s" if knob.figure in ("pulse_s", "exposure_s") else knob.figure
    if variable in printed:
        inside = printed[variable]
        inside = inside[(inside > low) & (inside < high)]
        values += [*inside, *np.nextafter(inside, 0.0), *np.nextafter(inside, np.inf)]
    if knob.figure == "rate_hz":
        inside = 1.0 / printed["time_s"][printed["time_s"] > 0.0]
        inside = inside[(inside > low) & (inside < high)]
        values += [*inside, *np.nextafter(inside, 0.0), *np.nextafter(inside, np.inf)]
    between = np.geomspace(low, high, BETWEEN) if low > 0.0 else np.linspace(low, high, BETWEEN)
    return np.unique(np.clip([*values, *between], low, high))


def corner_values(
    boxes: Mapping[Knob, tuple[float, float, float]],
    nominal: Sequence[Nominal],
    printed: Mapping[str, Floats],
    seed: int,
    most: int = CORNERS,
) -> dict[Knob, Floats]:
    """Values of every figure at the corners to judge.

    Parameters
    ----------
    boxes : low, nominal and high value of each figure
    nominal : the lines as given
    printed : boundaries by variable, see `breaks`
    seed : for the random choice among too many corners
    most : most corners; where there are more, the ends of every figure come first
    """
    choices = []
    for knob, (low, middle, high) in boxes.items():
        way = direction(knob, nominal, boxes)
        if way:
            choices.append(np.array([high if way > 0 else low]))
        else:
            choices.append(_candidates(knob, low, high, middle, printed))
    total = float(np.prod([len(c) for c in choices], dtype=float))
    if total <= most:
        grid = np.array(list(product(*choices)))
    else:
        draw = np.random.default_rng(seed)
        grid = np.stack([draw.choice(c, most) for c in choices], axis=1)
        ends = np.stack([draw.choice([c[0], c[-1]], most // 2) for c in choices], axis=1)
        grid[: len(ends)] = ends
    return {knob: grid[:, k] for k, knob in enumerate(boxes)}
