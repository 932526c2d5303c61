"""Geometry of charts: axes, ticks and paths in the units of a view box. Drawn by templates."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

__all__ = ["Axis", "Bar", "Chart", "Series", "bars", "chart", "ticks"]

WIDTH, HEIGHT = 640.0, 260.0
LEFT, RIGHT, TOP, BOTTOM = 78.0, 12.0, 12.0, 40.0
PREFIXES = {-15: "f", -12: "p", -9: "n", -6: "µ", -3: "m", 0: "", 3: "k", 6: "M", 9: "G", 12: "T"}


@dataclass(frozen=True, slots=True)
class Axis:
    """Title with unit, and ticks: place in the view box and text."""

    title: str
    ticks: list[tuple[float, str]]


@dataclass(frozen=True, slots=True)
class Series:
    """One line: its name, the points for a polyline, its number for the style."""

    name: str
    points: str
    number: int


@dataclass(frozen=True, slots=True)
class Bar:
    """A bar of a histogram or a ranking: its box and what it says."""

    x: float
    y: float
    width: float
    height: float
    text: str


@dataclass(frozen=True, slots=True)
class Chart:
    """A chart ready to draw."""

    width: float
    height: float
    left: float
    right: float
    top: float
    bottom: float
    x: Axis
    y: Axis
    series: list[Series]
    bars: list[Bar]


def ticks(low: float, high: float, most: int = 6) -> list[float]:
    """Round values from low to high, at most `most` steps of 1, 2 or 5 times a power of ten."""
    span = high - low
    if not span > 0.0:
        return [low]
    raw = span / most
    power = 10.0 ** math.floor(math.log10(raw))
    step = next(m * power for m in (1.0, 2.0, 5.0, 10.0) if m * power >= raw * (1.0 - 1e-9))
    first = math.ceil(low / step - 1e-9)
    return [k * step for k in range(first, math.floor(high / step + 1e-9) + 1)]


def _prefix(top: float, unit: str) -> tuple[float, str]:
    """Factor and unit with a prefix that suit a largest value; plain numbers stay as they are."""
    if not unit or not top > 0.0:
        return 1.0, unit
    power = min(12, max(-15, 3 * math.floor(math.log10(top) / 3.0 + 1e-9)))
    return 10.0**-power, PREFIXES[power] + unit


def _axis(name: str, unit: str, low: float, high: float, start: float, end: float) -> tuple[Axis, float]:
    factor, shown = _prefix(max(abs(low), abs(high)), unit)
    low, high = low * factor, high * factor
    scale = (end - start) / (high - low) if high > low else 0.0
    marks = [(round(start + (v - low) * scale, 2), f"{v:.6g}".replace("e+", "e")) for v in ticks(low, high)]
    return Axis(f"{name} [{shown}]" if shown else name, marks), factor


def chart(
    x_name: str,
    x_unit: str,
    y_name: str,
    y_unit: str,
    series: Sequence[tuple[str, Sequence[float], Sequence[float]]],
) -> Chart:
    """Lines over a common x; y starts at 0 unless something lies below."""
    xs = [v for _, x, _ in series for v in x]
    ys = [v for _, _, y in series for v in y]
    x_low, x_high = min(xs), max(xs)
    y_low, y_high = min(0.0, *ys), max(ys) or 1.0
    right, bottom = WIDTH - RIGHT, HEIGHT - BOTTOM
    x_axis, _ = _axis(x_name, x_unit, x_low, x_high, LEFT, right)
    y_axis, _ = _axis(y_name, y_unit, y_low, y_high, bottom, TOP)
    x_scale = (right - LEFT) / (x_high - x_low or 1.0)
    y_scale = (bottom - TOP) / (y_high - y_low or 1.0)
    drawn = [
        Series(
            name,
            " ".join(
                f"{LEFT + (u - x_low) * x_scale:.1f},{bottom - (v - y_low) * y_scale:.1f}"
                for u, v in zip(x, y, strict=True)
            ),
            k + 1,
        )
        for k, (name, x, y) in enumerate(series)
    ]
    return Chart(WIDTH, HEIGHT, LEFT, right, TOP, bottom, x_axis, y_axis, drawn, [])


def bars(x_name: str, x_unit: str, edges: Sequence[float], counts: Sequence[int]) -> Chart:
    """A histogram of counts between edges."""
    right, bottom = WIDTH - RIGHT, HEIGHT - BOTTOM
    total, top = sum(counts) or 1, max(counts) or 1
    low, high = edges[0], edges[-1]
    x_axis, factor = _axis(x_name, x_unit, low, high, LEFT, right)
    y_axis, _ = _axis("share of draws [%]", "", 0.0, 100.0 * top / total, bottom, TOP)
    scale = (right - LEFT) / (high - low or 1.0)
    drawn = []
    for a, b, n in zip(edges, edges[1:], counts, strict=False):
        height = (bottom - TOP) * n / top
        text = f"{a * factor:.4g} to {b * factor:.4g}: {100.0 * n / total:.3g} %"
        x, width = LEFT + (a - low) * scale, max((b - a) * scale - 0.5, 0.5)
        drawn.append(Bar(round(x, 2), round(bottom - height, 2), round(width, 2), round(height, 2), text))
    return Chart(WIDTH, HEIGHT, LEFT, right, TOP, bottom, x_axis, y_axis, [], drawn)
