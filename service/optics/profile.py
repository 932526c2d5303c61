"""Beam profiles from camera images: second moments, and the fraction inside an aperture at its worst "
"place."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["FlatImage", "Moments", "background_of", "moments", "worst_fraction"]

Floats = NDArray[np.float64]

#: Side of each corner patch over the side of the image.
CORNER = 0.06
#: The moments are taken within this many diameters around the centre (ISO 11146-1, from memory).
AREA = 3.0
ROUNDS = 60
#: Apertures wider than this many pixels are judged on an image of coarser pixels.
FINE = 100
#: Points per pixel side at which the rim of an aperture is resolved.
RIM = 8


class FlatImage(ValueError):
    """The image shows no beam."""


@dataclass(frozen=True, slots=True)
class Moments:
    """A beam by its second moments; lengths in metres, places from the middle of the first pixel.

    `x_m`, `y_m` centre; `width_x_m`, `width_y_m` second-moment diameters (4 sigma) along rows and columns;
    `major_m`, `minor_m` along the principal axes, `azimuth_rad` from x to the major one; `total` sum of
    all pixels within the area of integration; `edge_share` part of the total that lies in the outermost
    pixels, scaled as if they were a frame 1/20 of the image wide.
    """

    x_m: float
    y_m: float
    width_x_m: float
    width_y_m: float
    major_m: float
    minor_m: float
    azimuth_rad: float
    total: float
    edge_share: float


def background_of(image: Floats) -> float:
    """Background as the median of the means of the four corner patches; 0 for images without corners.

    Not their mean: a beam that reaches one corner must not be taken away.
    """
    rows, columns = (max(1, round(CORNER * n)) for n in image.shape)
    if min(image.shape) < 8:
        return 0.0
    patches = (
        image[:rows, :columns],
        image[:rows, -columns:],
        image[-rows:, :columns],
        image[-rows:, -columns:],
    )
    return float(np.median([patch.mean() for patch in patches]))


def moments(image: Floats, pixel_x_m: float, pixel_y_m: float) -> Moments:
    """Second moments of an image whose background is taken away already.

    <x> = sum x I / sum I, sigma_x^2 = sum (x - <x>)^2 I / sum I, d = 4 sigma, within an area of three
    diameters around the centre that is found step by step. Negative pixels stay: noise must cancel.

    Parameters
    ----------
    image : (rows, columns) signal
    pixel_x_m, pixel_y_m : size of a pixel [m]

    Raises
    ------
    FlatImage
        nothing stands out.

    Reference: ISO 11146-1 and ISO/TR 11146-3 (from memory).
    """
    rows, columns = image.shape
    x, y = np.arange(columns) * pixel_x_m, np.arange(rows) * pixel_y_m
    left, right, top, bottom = 0, columns, 0, rows
    found = None
    for _ in range(ROUNDS):
        part = image[top:bottom, left:right]
        total = float(part.sum())
        if not total > 0.0:
            break
        px, py = x[left:right], y[top:bottom]
        by_x, by_y = part.sum(axis=0), part.sum(axis=1)
        cx, cy = float(by_x @ px) / total, float(by_y @ py) / total
        xx, yy = float(by_x @ (px - cx) ** 2) / total, float(by_y @ (py - cy) ** 2) / total
        xy = float((py - cy) @ part @ (px - cx)) / total
        if not (xx > 0.0 and yy > 0.0):
            break
        found = (cx, cy, xx, yy, xy, total)
        half_x, half_y = AREA * 2.0 * np.sqrt(xx), AREA * 2.0 * np.sqrt(yy)
        area = (
            max(0, int(np.floor((cx - half_x) / pixel_x_m))),
            min(columns, int(np.ceil((cx + half_x) / pixel_x_m)) + 1),
            max(0, int(np.floor((cy - half_y) / pixel_y_m))),
            min(rows, int(np.ceil((cy + half_y) / pixel_y_m)) + 1),
        )
        if area == (left, right, top, bottom):
            break
        left, right, top, bottom = area
    if found is None:
        raise FlatImage("no beam stands out from the background")
    cx, cy, xx, yy, xy, total = found
    spread, twist = 0.5 * (xx + yy), np.hypot(0.5 * (xx - yy), xy)
    frame = image[[0, -1], :].sum() + image[1:-1, [0, -1]].sum()
    ring = 0.05 * min(rows, columns)
    return Moments(
        x_m=cx,
        y_m=cy,
        width_x_m=4.0 * np.sqrt(xx),
        width_y_m=4.0 * np.sqrt(yy),
        major_m=4.0 * float(np.sqrt(spread + twist)),
        minor_m=4.0 * float(np.sqrt(max(spread - twist, 0.0))),
        azimuth_rad=0.5 * float(np.arctan2(2.0 * xy, xx - yy)),
        total=total,
        edge_share=max(0.0, float(frame) * max(1.0, ring) / total),
    )


def worst_fraction(
    image: Floats, pixel_x_m: float, pixel_y_m: float, aperture_m: float, total: float
) -> tuple[float, float, float]:
    """Largest fraction of the beam inside a round aperture anywhere, and where its centre then lies.

    The sum over the aperture at every pixel, each pixel weighted by how much of it lies inside; by
    Fourier transform, and a parabola between pixels. Pixels are joined first where the aperture is many
    pixels wide.

    Parameters
    ----------
    image : (rows, columns) signal without background
    pixel_x_m, pixel_y_m : size of a pixel [m]
    aperture_m : diameter [m]
    total : signal of the whole beam

    Returns
    -------
    fraction in 0 to 1, x and y of the centre [m] from the middle of the first pixel
    """
    size_x, size_y = image.shape[1] * pixel_x_m, image.shape[0] * pixel_y_m
    if aperture_m >= 2.0 * np.hypot(size_x, size_y):
        whole = min(1.0, max(0.0, float(image.sum()) / total))
        return whole, 0.5 * (size_x - pixel_x_m), 0.5 * (size_y - pixel_y_m)
    join_x = max(1, int(aperture_m / pixel_x_m / FINE))
    join_y = max(1, int(aperture_m / pixel_y_m / FINE))
    coarse = _joined(image, join_y, join_x)
    wide_x, wide_y = pixel_x_m * join_x, pixel_y_m * join_y
    kernel = _disc(aperture_m, wide_x, wide_y)
    shape = [a + b - 1 for a, b in zip(coarse.shape, kernel.shape, strict=True)]
    size = [_smooth(n) for n in shape]
    sums = np.fft.irfft2(np.fft.rfft2(coarse, size) * np.fft.rfft2(kernel, size), size)
    sums = sums[: shape[0], : shape[1]]
    row, column = np.unravel_index(int(sums.argmax()), sums.shape)
    place = [
        (int(k) - (n - 1) // 2) * wide + 0.5 * (wide - pixel)
        for k, n, wide, pixel in (
            (column, kernel.shape[1], wide_x, pixel_x_m),
            (row, kernel.shape[0], wide_y, pixel_y_m),
        )
    ]
    largest = float(sums[row, column]) + _between(sums, int(row), int(column))
    return min(1.0, max(0.0, largest / total)), place[0], place[1]


def _between(sums: Floats, row: int, column: int) -> float:
    """What the largest sum gains when the aperture may stand between pixels: a parabola along each axis."""
    gain = 0.0
    for line, k in ((sums[row], column), (sums[:, column], row)):
        if 0 < k < len(line) - 1:
            before, top, after = (float(v) for v in line[k - 1 : k + 2])
            bend = 2.0 * top - before - after
            gain += (after - before) ** 2 / (8.0 * bend) if bend > 0.0 else 0.0
    return gain


def _joined(image: Floats, down: int, across: int) -> Floats:
    """Blocks of pixels added up; the rest is filled with nothing."""
    if down == across == 1:
        return image
    rows, columns = image.shape
    filled = np.zeros((-(-rows // down) * down, -(-columns // across) * across))
    filled[:rows, :columns] = image
    blocks = filled.reshape(filled.shape[0] // down, down, filled.shape[1] // across, across)
    joined: Floats = blocks.sum(axis=(1, 3))
    return joined


def _disc(diameter_m: float, pixel_x_m: float, pixel_y_m: float) -> Floats:
    """Part of each pixel inside a disc around the middle one."""
    across, down = (int(np.ceil(0.5 * diameter_m / p)) for p in (pixel_x_m, pixel_y_m))
    fine = (np.arange(RIM) + 0.5) / RIM - 0.5
    x = ((np.arange(-across, across + 1)[:, None] + fine) * pixel_x_m).ravel()
    y = ((np.arange(-down, down + 1)[:, None] + fine) * pixel_y_m).ravel()
    inside = (y[:, None] ** 2 + x**2 <= (0.5 * diameter_m) ** 2).astype(float)
    parts = inside.reshape(2 * down + 1, RIM, 2 * across + 1, RIM).mean(axis=(1, 3))
    # The points of the rim are coarse, the area is exact: the pixels of the rim make up for the rest.
    area = np.pi / 4.0 * diameter_m**2 / (pixel_x_m * pixel_y_m)
    whole = parts >= 1.0
    rim = np.where(whole, 0.0, parts)
    if rim.sum() == 0.0:
        rim[down, across] = 1.0
    missing = max(0.0, area - float(whole.sum()))
    disc: Floats = whole + np.minimum(1.0, rim * (missing / float(rim.sum())))
    return disc


def _smooth(n: int) -> int:
    """The next number without prime factors above 5, for a fast transform."""
    while True:
        rest = n
        for prime in (2, 3, 5):
            while rest % prime == 0:
                rest //= prime
        if rest == 1:
            return n
        n += 1
