"""Synthetic beams as images, and files of them."""

from __future__ import annotations

import base64
import io

import numpy as np
from PIL import Image

__all__ = ["Image16", "as_csv", "as_file", "gaussian", "png", "spots"]

Image16 = np.ndarray


def gaussian(
    major_mm: float,
    minor_mm: float,
    turned: float = 0.0,
    *,
    pixel_mm: float = 0.01,
    shape: tuple[int, int] = (480, 640),
    centre: tuple[float, float] = (0.48, 0.53),
    noise: float = 0.0,
    offset: float = 300.0,
) -> Image16:
    """A Gaussian of 1/e2 diameters [mm], turned [rad], on an offset with noise; counts of 16 bits."""
    rows, columns = shape
    x, y = np.meshgrid(np.arange(columns) * pixel_mm, np.arange(rows) * pixel_mm)
    x, y = x - centre[0] * columns * pixel_mm, y - centre[1] * rows * pixel_mm
    u, v = x * np.cos(turned) + y * np.sin(turned), -x * np.sin(turned) + y * np.cos(turned)
    signal = 40_000.0 * np.exp(-8.0 * ((u / major_mm) ** 2 + (v / minor_mm) ** 2))
    return signal + offset + np.random.default_rng(1).normal(0.0, noise, shape) * (noise > 0.0)


def spots(
    places: list[tuple[float, float]], diameter_mm: float, shape: tuple[int, int] = (300, 300)
) -> Image16:
    """Uniform discs of equal brightness; pixels of 0.01 mm, rims smoothed by 8 x 8 points a pixel."""
    fine = (np.arange(8) + 0.5) / 8 - 0.5
    x = ((np.arange(shape[1])[:, None] + fine) * 0.01).ravel()
    y = ((np.arange(shape[0])[:, None] + fine) * 0.01).ravel()
    found = np.zeros((y.size, x.size))
    for cx, cy in places:
        found += (x - cx) ** 2 + (y[:, None] - cy) ** 2 <= (diameter_mm / 2.0) ** 2
    return found.reshape(shape[0], 8, shape[1], 8).mean(axis=(1, 3)) * 1000.0


def as_file(image: Image16, kind: str) -> bytes:
    """A 16-bit PNG or TIFF."""
    buffer = io.BytesIO()
    Image.fromarray(np.clip(np.rint(image), 0, 65535).astype(np.uint16)).save(buffer, kind)
    return buffer.getvalue()


def png(image: Image16, kind: str = "PNG") -> str:
    """The file as base64."""
    return base64.b64encode(as_file(image, kind)).decode()


def as_csv(image: Image16, separator: str = ",") -> str:
    """A table of numbers."""
    return "\n".join(separator.join(f"{v:.6g}" for v in row) for row in image)
