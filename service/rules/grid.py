"""Which rows hold where: the limit rows painted once into a lookup grid.

The grid has one cell per printed boundary and one per band between two boundaries, in wavelength
and time, times small or extended source, times before or after each break time (T1, T2) that
rows use as a bound. A lookup is then one binary search per value and one gather. Painting also proves
that the tables tile: a gap or an unintended overlap refuses to load, naming file and line.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from service.rules.factors import Factor
from service.rules.limit_set import LimitSet
from service.rules.tables import LimitRow, TableError

__all__ = ["SMALL_SOURCE_MRAD", "Grid"]

#: Sources up to this subtense are small sources (alpha_min of every rule set, tables of t >= 10 s).
SMALL_SOURCE_MRAD = 1.5

Ints = NDArray[np.intp]
Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]


def _index(edges: Floats, value: float) -> int:
    """Position of a boundary among the edges; a break time is snapped to its printed neighbour."""
    return int(np.argmin(np.abs(np.log(edges) - math.log(value))))


class Grid:
    """Limit rows by wavelength [nm], time [s], subtense and break times.

    `table[target]` has one row per cell and kind (0: every row, 1: the rows to which the
    repetitive-pulse factor applies, `kind_stride` cells later) and one column per slot, -1 where empty.
    """

    def __init__(self, rules: LimitSet, factors: dict[str, Factor]) -> None:
        self._path = rules.path / "limits.csv"
        rows = rules.limits
        self.bounds = bounds = [
            (self._time(r, r.time_from_s, factors, min), self._time(r, r.time_to_s, factors, max))
            for r in rows
        ]
        self.wavelengths = np.unique([b for r in rows for b in (r.wavelength_from_nm, r.wavelength_to_nm)])
        printed = {t for r in rows for t in (r.time_from_s, r.time_to_s) if not isinstance(t, str)}
        self.times = np.array(sorted(float(t) for t in printed))
        self.exact = bool(rules.shared_wavelengths_nm or rules.shared_times_s)
        self.breaks = sorted({b for r in rows for b in (r.time_from_s, r.time_to_s) if isinstance(b, str)})
        self._factors = [factors[name] for name in self.breaks]
        self._shape = (2, 2 * len(self.wavelengths), 2 * len(self.times), 2, *(2 for _ in self.breaks))
        regular = [
            any(
                p.target in (r.target, "*") and p.tissue in (r.tissue, "*") and p.effect == r.effect
                for p in rules.repetition
            )
            for r in rows
        ]
        self.table: dict[str, NDArray[np.int16]] = {}
        self.targets = tuple(dict.fromkeys(row.target for row in rows))
        for target in self.targets:
            regions = [
                (k, self._region(rows[k], bounds[k], rules))
                for k in range(len(rows))
                if rows[k].target == target
            ]
            self._check(target, rows, regions, rules)
            self.table[target] = self._paint(regions, regular)
        strides = [int(np.prod(self._shape[k + 1 :])) for k in range(len(self._shape))]
        self.kind_stride, self._w, self._t, self._s, *self._b = strides

    def _time(
        self,
        row: LimitRow,
        bound: float | str,
        factors: dict[str, Factor],
        pick: Callable[[Iterable[float]], float],
    ) -> float:
        """A time bound as a number [s]: a break time counts with its least or largest value."""
        if not isinstance(bound, str):
            return bound
        if bound not in factors:
            raise TableError(self._path, row.line, f"time bound {bound!r} is no number and no break time")
        factor = factors[bound]
        if factor.variable == "wavelength_nm":
            ends = np.array([row.wavelength_from_nm, math.nextafter(row.wavelength_to_nm, 0)])
        else:
            ends = np.array([SMALL_SOURCE_MRAD, 1e3])
        return pick(factor(ends).tolist())

    def _region(self, row: LimitRow, bounds: tuple[float, float], rules: LimitSet) -> tuple[slice, ...]:
        """The cells of one row: slices over wavelength, time, source and the break times."""
        w0, w1 = (_index(self.wavelengths, b) for b in (row.wavelength_from_nm, row.wavelength_to_nm))
        t0, t1 = (_index(self.times, b) for b in bounds)
        if w1 <= w0 or t1 <= t0:
            raise TableError(self._path, row.line, f"row {row.row!r}: the band is empty")
        w_end = row.wavelength_to_nm in rules.shared_wavelengths_nm or w1 == len(self.wavelengths) - 1
        t_end = (row.time_to_s in rules.shared_times_s) or t1 == len(self.times) - 1
        source = {
            (None, None): slice(0, 2),
            (None, SMALL_SOURCE_MRAD): slice(0, 1),
            (SMALL_SOURCE_MRAD, None): slice(1, 2),
        }.get((row.subtense_from_mrad, row.subtense_to_mrad))
        if source is None:
            raise TableError(self._path, row.line, f"row {row.row!r}: subtense bounds other than 1.5 mrad")
        breaks = [
            slice(0, 1) if row.time_to_s == name else slice(int(row.time_from_s == name), 2)
            for name in self.breaks
        ]
        return (
            slice(2 * w0 + 1, 2 * w1 + 1 + w_end),
            slice(2 * t0 + 1, 2 * t1 + 1 + t_end),
            source,
            *breaks,
        )

    def _paint(self, regions: list[tuple[int, tuple[slice, ...]]], regular: list[bool]) -> NDArray[np.int16]:
        """Rows into slots, kind by kind; the widest cell sets the number of slots."""
        count = np.zeros(self._shape, dtype=np.int16)
        for k, region in regions:
            count[0][region] += 1
            count[1][region] += regular[k]
        table = np.full((*self._shape, int(count.max())), -1, dtype=np.int16)
        count[:] = 0
        for k, region in regions:
            for kind in (0, 1) if regular[k] else (0,):
                at = (kind, *region)
                cells = table[at]
                np.put_along_axis(cells, count[at][..., None].astype(np.intp), np.int16(k), axis=-1)
                table[at] = cells
                count[at] += 1
        return table.reshape(-1, table.shape[-1])

    def _check(
        self,
        target: str,
        rows: tuple[LimitRow, ...],
        regions: list[tuple[int, tuple[slice, ...]]],
        rules: LimitSet,
    ) -> None:
        """Refuse a gap inside the declared coverage, a row outside it and two rows in one band."""
        possible = self._possible()
        covers = [c for c in rules.coverage if c.target == target]
        blocks = []
        for cover in covers:
            if not {*cover.wavelength_nm} <= {*self.wavelengths} or not {*cover.time_s} <= {*self.times}:
                raise TableError(self._path, 1, f"gap for {target}: no row ends where the coverage does")
            w0, w1 = (_index(self.wavelengths, b) for b in cover.wavelength_nm)
            t0, t1 = (_index(self.times, b) for b in cover.time_s)
            block = (slice(2 * w0 + 1, 2 * w1 + 1), slice(2 * t0 + 1, 2 * t1 + 1))
            blocks.append(block)
            filled = np.zeros(self._shape[1:], dtype=bool)
            for k, region in regions:
                if cover.tissue in (None, rows[k].tissue) and cover.effect in (None, rows[k].effect):
                    filled[region] = True
            gap = ~filled & possible
            if gap[block].any():
                where = np.argwhere(gap[block])[0]
                w = self.wavelengths[w0 + where[0] // 2]
                t = self.times[t0 + where[1] // 2]
                raise TableError(
                    self._path, 1, f"gap for {target} {cover.tissue or ''} from {w:g} nm and {t:g} s"
                )
        seen: dict[tuple[str, str], NDArray[np.bool_]] = {}
        for k, region in regions:
            row = rows[k]
            taken = seen.setdefault((row.tissue, row.effect), np.zeros(self._shape[1:], dtype=bool))
            bands = np.zeros(self._shape[1:], dtype=bool)
            bands[region] = True
            bands[1::2] = False
            bands[:, 1::2] = False
            if (taken & bands).any():
                raise TableError(self._path, row.line, f"row {row.row!r} overlaps an earlier row")
            own = [c.tissue == row.tissue and c.effect in (None, row.effect) for c in covers]
            allowed = np.zeros(self._shape[1:], dtype=bool)
            for cover, block, named in zip(covers, blocks, own, strict=True):
                if named or (not any(own) and cover.tissue is None):
                    allowed[block] = True
            if (bands & ~allowed).any():
                raise TableError(self._path, row.line, f"row {row.row!r} lies outside the coverage")
            taken |= bands

    def _possible(self) -> NDArray[np.bool_]:
        """Cells that a real exposure can reach: before or after a break time only where it can lie.

        A break time of the subtense is tested at its ends; one of the wavelength within the band of
        each wavelength cell.
        """
        possible = np.ones(self._shape[1:], dtype=bool)
        starts = np.r_[self.times[0], np.repeat(self.times, 2)[:-1]]
        ends = np.r_[self.times[0], np.repeat(self.times, 2)[1:]]
        for axis, factor in enumerate(self._factors, start=3):
            if factor.variable == "wavelength_nm":
                low = np.r_[self.wavelengths[0], np.repeat(self.wavelengths, 2)[:-1]]
                high = np.r_[self.wavelengths[0], np.repeat(self.wavelengths, 2)[1:]]
                least, most = factor(low), factor(np.maximum(low, np.nextafter(high, 0.0)))
            else:
                least, most = factor(np.array([SMALL_SOURCE_MRAD])), factor(np.array([1e3]))
            shape = [1] * possible.ndim
            shape[0], shape[1] = -1, len(starts)
            slack = 1.0 + 1e-9
            before = np.broadcast_to((starts[None, :] * slack < most[:, None]).reshape(shape), possible.shape)
            after = np.broadcast_to((ends[None, :] > least[:, None] * slack).reshape(shape), possible.shape)
            side = np.indices(possible.shape)[axis]
            possible &= np.where(side == 0, before, after)
        return possible

    def cells(self, wavelength_nm: Floats, time_s: Floats, extended: Ints, after: Sequence[Bools]) -> Ints:
        """Cell of each exposure: 1-d arrays; `after` says for each break time whether it has passed."""
        if self.exact:
            w = np.searchsorted(self.wavelengths, wavelength_nm, "left") + np.searchsorted(
                self.wavelengths, wavelength_nm, "right"
            )
            t = np.searchsorted(self.times, time_s, "left") + np.searchsorted(self.times, time_s, "right")
        else:
            w = 2 * np.minimum(
                np.searchsorted(self.wavelengths, wavelength_nm, "right"), len(self.wavelengths) - 1
            )
            t = 2 * np.minimum(np.searchsorted(self.times, time_s, "right"), len(self.times) - 1)
        cell: Ints = w * self._w + t * self._t + extended * self._s
        for bit, stride in zip(after, self._b, strict=True):
            cell += bit * stride
        return cell

    def rows(self, target: str, cell: Ints, regular: Ints | None = None) -> NDArray[np.int16]:
        """Row numbers by cell and slot, -1 where empty; `regular` 1 keeps only rows with C_P."""
        return self.table[target][cell if regular is None else cell + regular * self.kind_stride]
