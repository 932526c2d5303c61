"""Which exposures add: additivity classes of the limit rows and of wavelengths."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from service.rules.ruleset import RuleSet
from service.rules.tables import AdditivityRow, LimitRow, TableError

__all__ = ["FRONT", "BandsThatAdd", "additivity_classes"]

#: Tissues at the front of the eye add with one another; every other tissue stays apart.
FRONT = ("cornea", "cornea/lens", "lens")


class BandsThatAdd:
    """The bands of the additivity table, joined to closed classes for eye and skin.

    Raises TableError where a pair of bands is missing or where "adds" does not hold between all
    bands of one class.
    """

    def __init__(self, rows: tuple[AdditivityRow, ...], path: Path) -> None:
        self.bands = sorted(
            {(r.band_from_nm, r.band_to_nm) for r in rows} | {(r.with_from_nm, r.with_to_nm) for r in rows}
        )
        joined: dict[str, dict[tuple[int, int], bool]] = {"eye": {}, "skin": {}}
        for row in rows:
            pair = (
                self.bands.index((row.band_from_nm, row.band_to_nm)),
                self.bands.index((row.with_from_nm, row.with_to_nm)),
            )
            for target, cell in (("eye", row.eye), ("skin", row.skin)):
                joined[target][pair] = joined[target][pair[::-1]] = cell == "yes"
        count = range(len(self.bands))
        if len(joined["eye"]) != len(self.bands) ** 2:
            raise TableError(path, 1, "a pair of bands is missing")
        self.leader: dict[str, list[int]] = {}
        for target, table in joined.items():
            first = self.leader[target] = [min(b for b in count if table[a, b]) for a in count]
            for (a, b), adds in table.items():
                if adds != (first[a] == first[b]):
                    raise TableError(path, 1, f"{target}: the bands that add do not form closed classes")

    def of(self, target: str, wavelength_nm: NDArray[np.float64]) -> NDArray[np.intp]:
        """Class number of each wavelength [nm] for eye or skin."""
        edges = np.array([low for low, _ in self.bands])
        return np.array(self.leader[target])[np.searchsorted(edges, wavelength_nm, "right") - 1]


def additivity_classes(rules: RuleSet) -> NDArray[np.intp]:
    """Class number of each limit row: rows of the same target and class add.

    Bands that the additivity table joins form one class per target; within it the front of the
    eye, the retina and the anterior criterion stay apart. Raises TableError where a limit row's
    wavelengths are in no band of the table.
    """
    adding = BandsThatAdd(rules.additivity, rules.path.parent / "additivity.csv")
    keys = [_key(row, adding, rules) for row in rules.limits]
    numbers = {key: n for n, key in enumerate(dict.fromkeys(keys))}
    return np.array([numbers[key] for key in keys])


def _key(row: LimitRow, adding: BandsThatAdd, rules: RuleSet) -> tuple[str, int, str]:
    for k, (low, high) in enumerate(adding.bands):
        if low <= row.wavelength_from_nm < high and row.wavelength_to_nm <= high:
            return row.target, adding.leader[row.target][k], "front" if row.tissue in FRONT else row.tissue
    raise TableError(
        rules.path / "limits.csv", row.line, f"row {row.row!r} lies in no band of additivity.csv"
    )
