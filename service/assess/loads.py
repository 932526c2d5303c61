"""The scale number that all lines of a laser together ask of one filter."""

from __future__ import annotations

import numpy as np

from service.assess.lines import Lines
from service.assess.scales import ScaleNeed, scale_needs, scale_number
from service.rules.eyewear import EyewearTables

__all__ = ["loads"]

#: Places at which an oblong beam is looked at between its waist and where the size factor ends.
PLACES = 200


def loads(
    lines: Lines, scales: list[list[ScaleNeed]], tables: EyewearTables, *, onward_m: list[float] | None
) -> list[list[int]]:
    """Scale number per line and mode with the lines of one band and mode added.

    Adding is stricter than line by line; no source that was read says how numbers add. With `onward_m`,
    the place [m] of each line, an oblong beam is also looked at farther on, where the size factor can
    grow faster than the irradiance falls.
    """
    sums: dict[tuple[str, str], float] = {}
    for k, needs in enumerate(scales):
        own: dict[tuple[str, str], float] = {}
        for need in needs:
            value = need.value * need.size_factor
            if onward_m is not None and need.mode == "D":
                value = max(value, _onward(lines, k, onward_m[k], need, tables))
            key = need.mode, need.row.row
            own[key] = max(own.get(key, 0.0), value)
        for key, value in own.items():
            sums[key] = sums.get(key, 0.0) + value
    return [[scale_number(n.row, sums[n.mode, n.row.row]) for n in needs] for needs in scales]


def _onward(lines: Lines, line: int, place_m: float, need: ScaleNeed, tables: EyewearTables) -> float:
    """Largest irradiance times size factor [W/m2] of mode D from a place [m] on."""
    beam = lines.beams.take(np.array([line]))
    x, y = beam.diameters_m(np.array([place_m]))
    farther = beam.diameters_m(np.array([place_m + 1.0]))
    if x[0] == y[0] and farther[0][0] == farther[1][0]:
        return 0.0
    held = 1e-3 * tables.use["size_to"].value
    end = 1e-3
    while end < 1e6 and max(d[0] for d in beam.diameters_m(np.array([place_m + end]))) < held:
        end *= 2.0
    best = 0.0
    for offset in np.geomspace(end * 1e-4, end, PLACES).tolist():
        for found in scale_needs(lines, line, place_m + offset, tables):
            if found.mode == "D" and found.text == need.text:
                best = max(best, found.value * found.size_factor)
    return best
