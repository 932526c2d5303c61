"""Piecewise factors of wavelength, time or subtense, compiled for arrays."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from service.rules.limit_set import LimitSet
from service.rules.tables import FactorRow, TableError

__all__ = ["Factor", "compile_factors"]

Floats = NDArray[np.float64]


class Factor:
    """One named factor: offset + coefficient x 10^(slope (x - origin) / per) x x^power by piece.

    Pieces hold for from <= x < to, the last includes its end; outside them the value is 1 (the
    loader makes sure that no limit row uses a factor there). On a boundary in `shared` the smaller
    of the two neighbours holds (the stricter reading), with `upper_ends` the lower band (as printed).
    """

    def __init__(self, rows: list[FactorRow], shared: tuple[float, ...], upper_ends: bool = False) -> None:
        self.name = rows[0].factor
        self._upper_ends = upper_ends
        self.unit = rows[0].unit
        self.variable = rows[0].variable
        self.rows = tuple(rows)
        end = rows[-1].to
        beyond = [] if end is None else [math.nextafter(end, math.inf)]
        self.edges = np.array([r.from_ for r in rows] + beyond)
        self.shared = np.array([b for b in shared if b in {r.from_ for r in rows[1:]}])
        self._offset = np.array([0.0] + [r.offset for r in rows] + [0.0])
        self._coefficient = np.array([1.0] + [r.coefficient for r in rows] + [1.0])
        self._slope = np.array([0.0] + [r.slope or 0.0 for r in rows] + [0.0])
        self._origin = np.array([0.0] + [r.origin or 0.0 for r in rows] + [0.0])
        self._per = np.array([1.0] + [r.per or 1.0 for r in rows] + [1.0])
        self._power = np.array([0.0] + [r.power or 0.0 for r in rows] + [0.0])
        self._has_slope = any(r.slope for r in rows)
        self._has_offset = any(r.offset for r in rows)
        self._has_power = any(r.power for r in rows)
        self.constant = len(rows) == 1 and not (self._has_slope or self._has_offset or self._has_power)

    def piece(self, x: Floats) -> NDArray[np.intp]:
        """Index into `rows`; -1 below the first piece, len(rows) beyond the last."""
        return np.searchsorted(self.edges, x, side="right") - 1

    def _values(self, piece: NDArray[np.intp], x: Floats) -> Floats:
        value: Floats = self._coefficient[piece]
        if self._has_slope:
            slope = self._slope[piece]
            at = slope.nonzero()[0]
            if at.size:
                p = piece[at]
                value[at] *= 10.0 ** (slope[at] * (x[at] - self._origin[p]) / self._per[p])
        if self._has_offset:
            value += self._offset[piece]
        if self._has_power:
            power = self._power[piece]
            at = power.nonzero()[0]
            if at.size:
                value[at] *= x[at] ** power[at]
        return value

    def __call__(self, x: Floats) -> Floats:
        """Values at x (1-d), in the factor's unit; x in the unit of the variable."""
        if self.constant:
            return np.full(x.shape, self._coefficient[1])
        value = self._values(np.searchsorted(self.edges, x, side="right"), x)
        if self.shared.size:
            on = np.isin(x, self.shared).nonzero()[0]
            if on.size:
                left = self._values(np.searchsorted(self.edges, x[on], side="left"), x[on])
                value[on] = left if self._upper_ends else np.minimum(value[on], left)
        return value


def compile_factors(rules: LimitSet) -> dict[str, Factor]:
    """All factors of a rule set by name.

    Raises TableError where the pieces of one factor leave a gap, overlap or change variable.
    """
    groups: dict[str, list[FactorRow]] = {}
    for row in rules.factors:
        groups.setdefault(row.factor, []).append(row)
    path = rules.path / "factors.csv"
    for rows in groups.values():
        for before, after in pairwise(rows):
            if before.to != after.from_ or before.variable != after.variable:
                raise TableError(path, after.line, f"{after.factor}: gap, overlap or new variable")
        for row in rows:
            if row.to is not None and row.to <= row.from_:
                raise TableError(path, row.line, f"{row.factor}: band is empty")
    shared = rules.shared_wavelengths_nm
    return {
        name: Factor(
            rows,
            shared if rows[0].variable == "wavelength_nm" else (),
            upper_ends=name == rules.roles["grouping"],
        )
        for name, rows in groups.items()
    }
