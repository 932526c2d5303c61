"""The laser warning symbol and the alert symbol as vector drawings, from the proportions in the table."""

from __future__ import annotations

import math
from functools import cache

from service.sign.tables import Symbol, sign_tables

__all__ = ["alert_symbol", "laser_symbol", "symbol_height", "viewing_distance_m", "yellow_share"]

Point = tuple[float, float]
ROOT3 = math.sqrt(3.0)


def _n(value: float) -> str:
    return f"{value:.4f}".rstrip("0").rstrip(".")


def _triangle(side: float, inset: float, radius: float) -> str:
    """Path of an equilateral triangle, point up, in a box of side x side: moved in by `inset`, corners round.

    The box starts at the left end of the base line's corner and the top corner.
    """
    inner = side - 2.0 * ROOT3 * inset
    left, bottom = ROOT3 * inset, side * ROOT3 / 2.0 - inset
    corners = [(left, bottom), (left + inner, bottom), (side / 2.0, 2.0 * inset)]
    cut = radius * ROOT3  # from the corner to where the arc touches: r / tan 30 degrees
    parts = []
    for k, corner in enumerate(corners):
        before, after = corners[k - 1], corners[(k + 1) % 3]
        start, end = _towards(corner, before, cut), _towards(corner, after, cut)
        parts.append(f"{'L' if k else 'M'}{_n(start[0])} {_n(start[1])}")
        if radius:
            parts.append(f"A{_n(radius)} {_n(radius)} 0 0 0 {_n(end[0])} {_n(end[1])}")
    return "".join(parts) + "Z"


def _towards(start: Point, goal: Point, way: float) -> Point:
    length = math.dist(start, goal)
    return tuple(s + (g - s) * way / length for s, g in zip(start, goal, strict=True))  # type: ignore[return-value]


def _svg(width: float, height: float, body: str, title: str) -> str:
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {_n(width)} {_n(height)}" role="img">'
        f"<title>{title}</title>{body}</svg>"
    )


@cache
def laser_symbol() -> str:
    """The warning triangle with the burst of a laser beam as SVG; the side is 100 units."""
    table, a = sign_tables().symbol, 100.0
    edge, band, burst = table.triangle.margin * a, table.triangle.band * a, table.burst
    radius = table.triangle.radius * a
    shapes = [
        (table.colours.yellow, _triangle(a, 0.0, radius)),
        (table.colours.black, _triangle(a, edge, radius - edge)),
        (table.colours.yellow, _triangle(a, edge + band, edge)),
    ]
    body = "".join(f'<path fill="{colour}" d="{path}"/>' for colour, path in shapes)
    x, y = a / 2.0, a * ROOT3 / 2.0 - a / (2.0 * ROOT3)
    rays = []
    for k in range(burst.rays):
        reach = (burst.long if k % 2 == 0 else burst.short) * a / 2.0
        reach = burst.beam * a / 2.0 if k == 0 else reach
        angle = 2.0 * math.pi * k / burst.rays
        rays.append(f"M{_n(x)} {_n(y)}L{_n(x + reach * math.cos(angle))} {_n(y + reach * math.sin(angle))}")
    stroke = f'stroke="{table.colours.black}" stroke-width="{_n(burst.stroke * a)}"'
    body += f'<path fill="none" {stroke} d="{"".join(rays)}"/>'
    body += f'<circle cx="{_n(x)}" cy="{_n(y)}" r="{_n(burst.disc * a / 2.0)}" fill="{table.colours.black}"/>'
    return _svg(a, a * ROOT3 / 2.0, body, "Warning: laser beam")


@cache
def alert_symbol(colour: str, mark: str) -> str:
    """A triangle with an exclamation mark, for the signal word: `colour` of the triangle and of the mark."""
    body = (
        f'<path fill="{colour}" d="{_triangle(100.0, 0.0, 5.0)}"/>'
        f'<path fill="{mark}" d="M45 30L55 30L53 60L47 60Z"/>'
        f'<circle cx="50" cy="70" r="5.5" fill="{mark}"/>'
    )
    return _svg(100.0, 50.0 * ROOT3, body, "Safety alert")


def symbol_height() -> float:
    """Height of the drawing per side."""
    return ROOT3 / 2.0


def _area(side: float, radius: float) -> float:
    """Area of an equilateral triangle with round corners: each takes r^2 (sqrt 3 - pi / 3) away."""
    return ROOT3 / 4.0 * side * side - 3.0 * radius * radius * (ROOT3 - math.pi / 3.0)


def yellow_share() -> float:
    """Share of the triangle that is yellow; where rays overlap beside the disc they count twice."""
    table: Symbol = sign_tables().symbol
    edge, band, radius, burst = (
        table.triangle.margin,
        table.triangle.band,
        table.triangle.radius,
        table.burst,
    )
    whole = _area(1.0, radius)
    black = _area(1.0 - 2.0 * ROOT3 * edge, radius - edge)
    inner = _area(1.0 - 2.0 * ROOT3 * (edge + band), edge)
    longs, shorts = burst.long * (burst.rays / 2.0 - 1.0) + burst.beam, burst.short * burst.rays / 2.0
    rays = (longs + shorts - burst.rays * burst.disc) / 2.0 * burst.stroke
    disc = math.pi * burst.disc**2 / 4.0
    return (whole - black + inner - rays - disc) / whole


def viewing_distance_m(side_m: float) -> float:
    """Distance [m] from which a triangle of this side [m] is recognised: the smaller of two rules.

    h = L / height_factor and A = L^2 / area_factor (ISO 3864-1), h and A of the triangle with its round
    corners: the top corner loses its radius, the area what the corners lose.
    """
    table = sign_tables().symbol
    height = side_m * (ROOT3 / 2.0 - table.triangle.radius)
    area = side_m**2 * _area(1.0, table.triangle.radius)
    rule = table.viewing
    return min(rule.height_factor * height, math.sqrt(rule.area_factor * area))
