"""Limiting apertures by target, tissue, wavelength and time, compiled for arrays."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from service.rules.ruleset import RuleSet
from service.rules.tables import TableError

__all__ = ["Apertures"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]


class Apertures:
    """Limiting apertures: a track (target, tissue, wavelength band) of pieces in time per row."""

    def __init__(self, rules: RuleSet) -> None:
        path = rules.path / "apertures.csv"
        tracks: dict[tuple[str, str, float, float], list[int]] = {}
        for k, a in enumerate(rules.apertures):
            tracks.setdefault((a.target, a.tissue, a.wavelength_from_nm, a.wavelength_to_nm), []).append(k)
        self.times = np.unique([a.time_from_s for a in rules.apertures])
        last = max(a.time_to_s for a in rules.apertures)
        columns = []
        for pieces in tracks.values():
            rows = [rules.apertures[k] for k in pieces]
            joined = all(a.time_to_s == b.time_from_s for a, b in pairwise(rows))
            if not joined or rows[0].time_from_s != self.times[0] or rows[-1].time_to_s != last:
                raise TableError(path, rows[0].line, "the aperture leaves a gap in time or overlaps")
            found = [max(k for k in pieces if rules.apertures[k].time_from_s <= t) for t in self.times]
            columns.append(found)
        self.number = np.array(columns)
        self.coefficient = np.array([a.coefficient_mm for a in rules.apertures]) * 1e-3
        self.power = np.array([a.time_power for a in rules.apertures])
        self.near = np.zeros(len(rules.limits), dtype=np.intp)
        self.far = np.zeros(len(rules.limits), dtype=np.intp)
        self.split = np.full(len(rules.limits), np.inf)
        keys = list(tracks)
        for k, row in enumerate(rules.limits):
            named = any(key[:2] == (row.target, row.tissue) for key in keys)
            fit = [
                n
                for n, (target, tissue, low, high) in enumerate(keys)
                if target == row.target
                and tissue == (row.tissue if named else "*")
                and low < row.wavelength_to_nm
                and high > row.wavelength_from_nm
            ]
            spans = [(keys[n][2], keys[n][3]) for n in fit]
            gap = not fit or spans[0][0] > row.wavelength_from_nm or spans[-1][1] < row.wavelength_to_nm
            if gap or len(fit) > 2 or (len(fit) == 2 and spans[0][1] != spans[1][0]):
                raise TableError(path, 1, f"no aperture over the whole band of limit row {row.row!r}")
            self.near[k], self.far[k] = fit[0], fit[-1]
            if len(fit) == 2:
                self.split[k] = spans[1][0]

    def rows(self, row: NDArray[np.int16], wavelength_nm: Floats, time_s: Floats) -> Ints:
        """Number of the aperture row that serves each limit row."""
        track = np.where(wavelength_nm >= self.split[row], self.far[row], self.near[row])
        found: Ints = self.number[track, np.searchsorted(self.times, time_s, "right") - 1]
        return found

    def __call__(self, row: NDArray[np.int16], wavelength_nm: Floats, time_s: Floats) -> Floats:
        """Aperture diameter [m] of each limit row at a duration [s]. 1-d arrays."""
        number = self.rows(row, wavelength_nm, time_s)
        diameter: Floats = self.coefficient[number]
        power = self.power[number]
        k = power.nonzero()[0]
        if k.size:
            diameter[k] *= time_s[k] ** power[k]
        return diameter
