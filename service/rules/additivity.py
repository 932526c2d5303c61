"""Which exposures add: additivity classes of the limit rows."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from service.rules.ruleset import RuleSet
from service.rules.tables import LimitRow, TableError

__all__ = ["additivity_classes"]

#: Tissues at the front of the eye add with one another; every other tissue stays apart.
FRONT = ("cornea", "cornea/lens", "lens")


def additivity_classes(rules: RuleSet) -> NDArray[np.intp]:
    """Class number of each limit row: rows of the same target and class add.

    Bands that the additivity table joins form one class per target; within it the front of the
    eye, the retina and the anterior criterion stay apart.

    Raises TableError where a limit row's wavelength is in no band of the table, or where "adds"
    does not hold between all bands of one class.
    """
    path = rules.path.parent / "additivity.csv"
    bands = sorted(
        {(r.band_from_nm, r.band_to_nm) for r in rules.additivity}
        | {(r.with_from_nm, r.with_to_nm) for r in rules.additivity}
    )
    joined: dict[str, dict[tuple[int, int], bool]] = {"eye": {}, "skin": {}}
    for row in rules.additivity:
        pair = (
            bands.index((row.band_from_nm, row.band_to_nm)),
            bands.index((row.with_from_nm, row.with_to_nm)),
        )
        for target, cell in (("eye", row.eye), ("skin", row.skin)):
            joined[target][pair] = joined[target][pair[::-1]] = cell == "yes"
    if len(joined["eye"]) != len(bands) ** 2:
        raise TableError(path, 1, "a pair of bands is missing")
    leader: dict[str, list[int]] = {}
    for target, table in joined.items():
        leader[target] = [min(b for b in range(len(bands)) if table[a, b]) for a in range(len(bands))]
        for (a, b), adds in table.items():
            if adds != (leader[target][a] == leader[target][b]):
                raise TableError(path, 1, f"{target}: the bands that add do not form closed classes")
    keys = [_key(row, bands, leader[row.target], rules) for row in rules.limits]
    numbers = {key: n for n, key in enumerate(dict.fromkeys(keys))}
    return np.array([numbers[key] for key in keys])


def _key(
    row: LimitRow, bands: list[tuple[float, float]], leader: list[int], rules: RuleSet
) -> tuple[str, int, str]:
    for k, (low, high) in enumerate(bands):
        if low <= row.wavelength_from_nm < high and row.wavelength_to_nm <= high:
            return row.target, leader[k], "front" if row.tissue in FRONT else row.tissue
    raise TableError(
        rules.path / "limits.csv", row.line, f"row {row.row!r} lies in no band of additivity.csv"
    )
