"""Charts as geometry: what templates/chart.svg draws."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass, field

from service.web.axes import Axis
from service.web.runs import Run, runs

__all__ = [
    "BOTTOM",
    "LANE",
    "LEFT",
    "RIGHT",
    "Curve",
    "Mark",
    "Plot",
    "Reading",
    "Zone",
    "curve",
    "mark",
    "zone",
]

WIDTH, HEIGHT = 600.0, 400.0
LEFT, RIGHT, BOTTOM = 78.0, 584.0, 346.0
#: Height of the line of the y title, and of one lane above the plot.
HEAD, LANE = 30.0, 26.0
#: Points closer than this in both directions are drawn as one.
NEAR = 0.4


@dataclass(frozen=True, slots=True)
class Curve:
    """One curve with its label; `kind` is its class in the stylesheet."""

    kind: str
    label: str
    path: str
    label_x: float
    label_y: float
    named: bool


@dataclass(frozen=True, slots=True)
class Zone:
    """A lane above the plot: a bar from `start` to `end`, or a text where there is none."""

    kind: str
    name: str
    top: float
    start: float
    end: float
    open_ended: bool
    label: list[Run]

    @property
    def drawn(self) -> bool:
        """Whether there is a bar."""
        return self.end > self.start

    @property
    def inside(self) -> bool:
        """Whether the label stands inside the bar, which leaves it no room beside."""
        return self.end > LEFT + 0.7 * (RIGHT - LEFT)


@dataclass(frozen=True, slots=True)
class Mark:
    """A chosen value on the x axis."""

    at: float
    label: list[Run]

    @property
    def before(self) -> bool:
        """Whether the label stands before the line."""
        return self.at > (LEFT + RIGHT) / 2


@dataclass(frozen=True, slots=True)
class Reading:
    """What the chart says at one place: where, in words, and the height of each curve."""

    at: float
    text: str
    heights: list[float | None]


@dataclass(frozen=True, slots=True)
class Plot:
    """A whole chart."""

    id: str
    title: str
    description: str
    x: Axis
    y: Axis
    x_title: str
    y_title: str
    curves: list[Curve]
    zones: list[Zone] = field(default_factory=list)
    marks: list[Mark] = field(default_factory=list)
    limit: float | None = None
    readings: list[Reading] = field(default_factory=list)
    reader: str = ""

    @property
    def top(self) -> float:
        """Upper edge of the plotted area."""
        return self.y.end

    def readings_json(self) -> str:
        """The readings for the script: [place, words, heights]."""

        def short(value: float | None) -> float | None:
            return None if value is None else round(value, 1)

        rows = [[short(r.at), r.text, [short(h) for h in r.heights]] for r in self.readings]
        return json.dumps(rows, ensure_ascii=False, separators=(",", ":"))


def top_of(lanes: int) -> float:
    """Upper edge of the plotted area below so many lanes."""
    return HEAD + lanes * LANE + 10.0


def curve(
    kind: str,
    label: str,
    x: Axis,
    y: Axis,
    points: Sequence[tuple[float, float | None]],
    above: bool = True,
    label_part: float = 0.02,
) -> Curve:
    """A curve through points (x, y); broken where y is None. Its label stands `label_part` along."""
    drawn: list[tuple[float, float] | None] = [
        None if value is None else (x.at(place), y.at(value)) for place, value in points
    ]
    label_x = x.start + label_part * (x.end - x.start)
    known = [p for p in drawn if p is not None and y.end - 1 <= p[1] <= y.start + 1]
    label_y = min(known, key=lambda p: abs(p[0] - label_x))[1] if known else y.start
    label_y += -7.0 if above else 15.0
    label_y = min(max(label_y, y.end + 13.0), y.start - 5.0)
    return Curve(kind, label, _path(drawn), label_x, label_y, bool(known))


def _path(points: Sequence[tuple[float, float] | None]) -> str:
    """Path data; a lone point becomes a dot."""
    parts: list[str] = []
    last: tuple[float, float] | None = None
    for k, point in enumerate(points):
        if point is None:
            last = None
            continue
        ends = k + 1 == len(points) or points[k + 1] is None
        if last is None:
            parts.append(f"M{point[0]:.1f} {point[1]:.1f}" + ("h0.1" if ends else ""))
        elif not ends and abs(point[0] - last[0]) < NEAR and abs(point[1] - last[1]) < NEAR:
            continue
        else:
            parts.append(f"L{point[0]:.1f} {point[1]:.1f}")
        last = point
    return "".join(parts)


def zone(
    kind: str, name: str, lane: int, x: Axis, ends: tuple[float, float | None] | None, label: str
) -> Zone:
    """A lane: `ends` are the ends of its bar on the axis (None as the far end: without end)."""
    top = HEAD + lane * LANE
    if ends is None:
        return Zone(kind, name, top, x.start, x.start, False, runs(label))
    start = min(max(x.at(ends[0]), x.start), x.end)
    end = x.end if ends[1] is None else min(max(x.at(ends[1]), x.start), x.end)
    return Zone(kind, name, top, start, max(end, start + 2.0), ends[1] is None, runs(label))


def mark(x: Axis, value: float, label: str) -> Mark:
    """A chosen value; at the edge where it lies outside."""
    return Mark(min(max(x.at(value), x.start), x.end), runs(label))
