"""A beam profile as a small picture of cells, with its ellipse and an aperture. Drawn by a template."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["Heat", "heat"]

#: Most cells along the longer side, and steps of brightness.
CELLS, STEPS = 72, 8


@dataclass(frozen=True, slots=True)
class Heat:
    """Cells as (x, y, width, step), a row of equal steps joined; sizes in cells."""

    columns: int
    rows: int
    cells: list[tuple[int, int, int, int]]
    per_mm: tuple[float, float]


def heat(signal: NDArray[np.float64], pixel_m: tuple[float, float]) -> Heat:
    """The picture of a signal (rows, columns) with its pixel size [m]."""
    rows, columns = signal.shape
    join = max(1, math.ceil(max(rows, columns) / CELLS))
    down, across = math.ceil(rows / join), math.ceil(columns / join)
    filled = np.zeros((down * join, across * join))
    filled[:rows, :columns] = signal
    coarse = filled.reshape(down, join, across, join).mean(axis=(1, 3))
    top = coarse.max() or 1.0
    step = np.clip(np.rint(coarse / top * STEPS), 0, STEPS).astype(int)
    cells = []
    for y in range(down):
        line = step[y]
        starts = np.flatnonzero(np.r_[True, line[1:] != line[:-1]])
        for start, end in zip(starts, [*starts[1:], across], strict=True):
            if line[start] > 0:
                cells.append((int(start), y, int(end - start), int(line[start])))
    return Heat(across, down, cells, (1e-3 / (pixel_m[0] * join), 1e-3 / (pixel_m[1] * join)))
