"""Sources that are not one disc: the part of a source that is worst for the retina.

A part is a rectangle anywhere in the source, each side from alpha_min to alpha_max; its angular subtense
is the mean of both sides. A larger part holds more power but may also emit more: which part is the worst
is found by trying every place and many sides, with sums of rectangles from a summed-area table.

Reference: IEC 60825-1:2014, clause 4.3 d), and ICNIRP 2013, on non-uniform and multiple sources (both from
memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["Parts", "drawn", "frontier", "parts"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

#: Sides tried first along each axis, and how often the best of them are refined.
SIDES, REFINED = 32, 6
#: Points per side at which the rim of an emitter is resolved.
RIM = 4


@dataclass(slots=True)
class Parts:
    """Rectangles of a source, the best place of each; all arrays (n,).

    `width_rad`, `height_rad` sides as counted; `x_rad`, `y_rad` the corner nearest to the first pixel;
    `share` of the power inside; `alpha_rad` mean of both sides held between alpha_min and alpha_max.
    """

    width_rad: Floats
    height_rad: Floats
    x_rad: Floats
    y_rad: Floats
    share: Floats
    alpha_rad: Floats

    def take(self, index: Ints) -> Parts:
        """The parts at `index`."""
        return Parts(*(getattr(self, name)[index] for name in self.__slots__))


def drawn(
    x_rad: Floats, y_rad: Floats, width_rad: Floats, height_rad: Floats, round_: NDArray[np.bool_],
    power: Floats, pixel_rad: float,
) -> Floats:  # fmt: skip
    """Emitters as an image (rows, columns) of power per pixel, with a margin of nothing around.

    Parameters
    ----------
    x_rad, y_rad : (n,) centres [rad], any origin
    width_rad, height_rad : (n,) sizes [rad]
    round_ : (n,) ellipse instead of a rectangle
    power : (n,) power of each emitter, any unit
    pixel_rad : side of a pixel [rad]

    Each emitter keeps its whole power; one smaller than a pixel is a point.
    """
    left, top = (x_rad - 0.5 * width_rad).min(), (y_rad - 0.5 * height_rad).min()
    columns = int(np.ceil(((x_rad + 0.5 * width_rad).max() - left) / pixel_rad - 1e-9)) or 1
    rows = int(np.ceil(((y_rad + 0.5 * height_rad).max() - top) / pixel_rad - 1e-9)) or 1
    image = np.zeros((rows, columns))
    fine = (np.arange(RIM) + 0.5) / RIM
    for cx, cy, w, h, disc, watts in zip(x_rad, y_rad, width_rad, height_rad, round_, power, strict=True):
        c0, c1 = (int(np.floor((cx + s * 0.5 * w - left) / pixel_rad)) for s in (-1.0, 1.0))
        r0, r1 = (int(np.floor((cy + s * 0.5 * h - top) / pixel_rad)) for s in (-1.0, 1.0))
        c1, r1 = min(c1, columns - 1), min(r1, rows - 1)
        c0, r0 = min(c0, c1), min(r0, r1)
        u = ((np.arange(c0, c1 + 1)[:, None] + fine).ravel() * pixel_rad + left - cx) / (0.5 * w)
        v = ((np.arange(r0, r1 + 1)[:, None] + fine).ravel() * pixel_rad + top - cy) / (0.5 * h)
        box = (np.abs(v)[:, None] <= 1.0) & (np.abs(u) <= 1.0)
        inside = v[:, None] ** 2 + u**2 <= 1.0 if disc else box
        cover = inside.reshape(r1 - r0 + 1, RIM, c1 - c0 + 1, RIM).mean(axis=(1, 3))
        if cover.sum() == 0.0:
            cover[cover.shape[0] // 2, cover.shape[1] // 2] = 1.0
        image[r0 : r1 + 1, c0 : c1 + 1] += watts * cover / cover.sum()
    return image


def parts(
    image: Floats, pixel_x_rad: float, pixel_y_rad: float, alpha_min_rad: float, alpha_max_rad: float
) -> Parts:
    """The place that holds most power for every rectangle tried.

    Sides from alpha_min (or a pixel) to alpha_max (or the image), evenly in the logarithm, then in
    steps of one pixel around those with the most power for their subtense. A rectangle of n pixels counts
    as n - 2 wide: every side between n - 2 and n - 1 pixels lies within it wherever it begins, so that no
    rectangle of any size and place is worse than what is found.

    Parameters
    ----------
    image : (rows, columns) power per pixel, none negative
    pixel_x_rad, pixel_y_rad : angular size of a pixel [rad]
    alpha_min_rad, alpha_max_rad : bounds of the angular subtense [rad]
    """
    table = np.zeros((image.shape[0] + 1, image.shape[1] + 1))
    table[1:, 1:] = image.cumsum(axis=0).cumsum(axis=1)
    pixels = (pixel_x_rad, pixel_y_rad)
    bounds = [
        _bounds(count, pixel, alpha_min_rad, alpha_max_rad)
        for count, pixel in zip(image.shape[::-1], pixels, strict=True)
    ]
    across, down = (_sides(low, high) for low, high in bounds)
    sizes = {(int(w), int(h)) for w in across for h in down}
    found = {size: _best(table, *size) for size in sizes}

    def alpha(size: tuple[int, int]) -> float:
        sides = (
            min(max((n - 2) * p, alpha_min_rad), alpha_max_rad) for n, p in zip(size, pixels, strict=True)
        )
        return 0.5 * sum(sides)

    for _ in range(REFINED):
        ranked = sorted(found, key=lambda size: -found[size][0] / alpha(size))[:8]
        step = [max(1, round(0.08 * max(s[k] for s in ranked))) for k in (0, 1)]
        fresh = {
            (min(max(w + i, bounds[0][0]), bounds[0][1]), min(max(h + j, bounds[1][0]), bounds[1][1]))
            for w, h in ranked
            for i in {-step[0], -1, 0, 1, step[0]}
            for j in {-step[1], -1, 0, 1, step[1]}
        } - found.keys()
        if not fresh:
            break
        found |= {size: _best(table, *size) for size in fresh}
    total = float(table[-1, -1])
    sizes_found = list(found)
    width, height = (np.array([max(1, s[k] - 2) for s in sizes_found]) * pixels[k] for k in (0, 1))
    places = np.array([found[s] for s in sizes_found])
    return Parts(
        width_rad=width,
        height_rad=height,
        x_rad=places[:, 1] * pixel_x_rad,
        y_rad=places[:, 2] * pixel_y_rad,
        share=np.minimum(1.0, places[:, 0] / total),
        alpha_rad=np.array([alpha(s) for s in sizes_found]),
    )


def _bounds(count: int, pixel: float, low: float, high: float) -> tuple[int, int]:
    """Fewest and most pixels of a side: what alpha_min covers at least, what alpha_max holds."""
    most = min(count, int(np.floor(high / pixel + 1e-9)) + 2)
    return min(most, int(np.floor(low / pixel + 1e-9)) + 2), most


def _sides(low: int, high: int) -> Ints:
    """Sides in pixels from low to high."""
    if high - low < SIDES:
        return np.arange(low, high + 1)
    return np.unique(np.rint(np.geomspace(low, high, SIDES)).astype(np.intp))


def _best(table: Floats, width: int, height: int) -> tuple[float, int, int]:
    """Largest sum of a rectangle of so many pixels, and its first column and row."""
    sums = (
        table[height:, width:] - table[:-height, width:] - table[height:, :-width] + table[:-height, :-width]
    )
    row, column = np.unravel_index(int(sums.argmax()), sums.shape)
    return float(sums[row, column]), int(column), int(row)


def frontier(found: Parts) -> Parts:
    """The parts that hold more power than every part of a smaller or equal subtense, ascending."""
    order = np.lexsort((-found.share, found.alpha_rad))
    share = found.share[order]
    before = np.r_[-1.0, np.maximum.accumulate(share)[:-1]]
    return found.take(order[share > before * (1.0 + 1e-12)])
