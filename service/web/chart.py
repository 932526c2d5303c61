"""The chart of an evaluation: exposure over limit against distance."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from service.contract.along import TargetAlong, along
from service.contract.evaluation import EvaluationResult
from service.contract.request import EvaluationRequest
from service.contract.result import TargetAnswer
from service.web.axes import Axis, decades
from service.web.numbers import plain, shown_down, shown_up
from service.web.plot import BOTTOM, LEFT, RIGHT, Curve, Plot, Reading, curve, mark, top_of, zone

__all__ = ["Chart", "Row", "chart_of", "request_of"]

Floats = NDArray[np.float64]

#: Distances that the axis shows at least, and at most [m].
SHOWN_M = (0.1, 10.0)
WIDEST_M = (1e-4, 1e10)
#: Readings along the axis, and places of the curve itself.
READINGS, PLACES = 97, 240
#: The lowest ratio that matters on a chart.
LEAST_RATIO = 1e-3


@dataclass(frozen=True, slots=True)
class Row:
    """One row of the data table; figures of each target as (ratio, exposure, limit)."""

    distance_m: float
    chosen: bool
    figures: list[tuple[float, float, float]]


@dataclass(frozen=True, slots=True)
class Chart:
    """The drawing, what it says in a sentence, and its table."""

    plot: Plot
    names: list[str]
    sentences: list[str]
    rows: list[Row]


class _Target(NamedTuple):
    """A target as the chart knows it: its key in the answer, its class, its name."""

    key: str
    kind: str
    name: str
    answer: TargetAnswer


def request_of(inputs: dict[str, Any]) -> EvaluationRequest:
    """The request that an answer echoes as its inputs."""
    return EvaluationRequest.model_validate({k: v for k, v in inputs.items() if v is not None})


def _targets(result: EvaluationResult) -> list[_Target]:
    found = [_Target("eye", "eye", "Eye", result.eye), _Target("skin", "skin", "Skin", result.skin)]
    if result.eye_aided is not None:
        found.append(_Target("eye_aided", "aided", "Aided", result.eye_aided))
    return found


def _range_m(result: EvaluationResult) -> tuple[float, float]:
    """Whole decades of distance that show the zones, the hottest places and the viewing distance."""
    places = list(SHOWN_M)
    for *_, target in _targets(result):
        near, far = target.hazard_zone_m or (0.0, 0.0)
        places += [p for p in (near, target.worst_place_m) if p > 0.0]
        places += [far * 3.0] if far else []
    if result.eye.at_distance is not None and result.eye.at_distance.distance_m > 0.0:
        places += [result.eye.at_distance.distance_m * part for part in (1 / 1.5, 1.5)]
    low, high = (min(max(p, WIDEST_M[0]), WIDEST_M[1]) for p in (min(places), max(places)))
    return decades(low, high)


def _three_digits(low: float, high: float, count: int) -> Floats:
    """Distances evenly spread over the powers of ten that need no more than three digits."""
    return np.unique([float(f"{v:.3g}") for v in np.geomspace(low, high, count)])


def _one_two_five(low: float, high: float) -> list[float]:
    first, last = math.floor(math.log10(low) + 1e-9), math.ceil(math.log10(high) - 1e-9)
    every = (1.0, 2.0, 5.0) if last - first <= 6 else (1.0,)
    values = [float(f"{digit:g}e{k}") for k in range(first, last + 1) for digit in every]
    return [v for v in values if low * (1 - 1e-9) <= v <= high * (1 + 1e-9)]


def _places(result: EvaluationResult, low: float, high: float, asked: Floats) -> Floats:
    """Places of the curve: evenly spread, close together about each peak, and those to be read."""
    parts = [np.geomspace(low, high, PLACES), asked]
    for *_, target in _targets(result):
        peak = target.worst_place_m
        near = np.geomspace(1e-4, 0.5, 12) if peak > 0.0 else np.array([])
        parts += [peak * (1.0 + near), peak * (1.0 - near), np.array([peak])]
    places = np.unique(np.concatenate(parts))
    return places[(places >= low) & (places <= high)]


def _heights(ratios: Floats) -> tuple[float, float]:
    """Whole decades of ratio that show the curves and the limit; the faintest part is cut off."""
    top = max(float(ratios.max()) * 1.3, 1.3)
    floor = min(LEAST_RATIO, max(float(ratios.max(initial=0.0)), 1e-30) / 100.0)
    faintest = float(ratios[ratios > 0.0].min(initial=1.0))
    return decades(min(max(faintest, floor), 0.3), top)


def _zone_label(target: TargetAnswer) -> str:
    if target.hazard_zone_m is None:
        return "no limit is exceeded"
    near, far = target.hazard_zone_m
    end = "no end" if far is None else f"{shown_up(far)} m"
    return f"{shown_down(near)} m to {end}" if near > 0.0 else end


def _sentence(name: str, target: TargetAnswer) -> str:
    if target.hazard_zone_m is None:
        most = shown_up(target.hazard_ratio)
        return f"{name}: at no distance above the limit; at most {most} times the limit."
    near, far = target.hazard_zone_m
    start = f"from {shown_down(near)} m " if near > 0.0 else ""
    end = "without end" if far is None else f"out to {shown_up(far)} m"
    worst = f"at most {shown_up(target.hazard_ratio)} times, at {shown_down(target.worst_place_m)} m"
    return f"{name}: above the limit {start}{end}; {worst}."


def _ratios_said(names: list[str], ratios: list[float]) -> str:
    """'eye 3.2 times, skin 0.1 times' (the limit)."""
    return ", ".join(f"{n.lower()} {shown_up(r)} times" for n, r in zip(names, ratios, strict=True))


def chart_of(result: EvaluationResult) -> Chart:
    """Chart, sentences and table of one answer."""
    low, high = _range_m(result)
    targets = _targets(result)
    names = [t.name for t in targets]
    viewing = None if result.eye.at_distance is None else result.eye.at_distance.distance_m
    read = np.unique([*_three_digits(low, high, READINGS), *([viewing] if viewing else [])])
    listed = sorted({*_one_two_five(low, high), *([] if viewing is None else [viewing])})
    places = np.unique([*_places(result, low, high, read), *listed])
    by_key = along(request_of(result.inputs), places)
    found = [by_key[t.key] for t in targets]
    shown = (places >= low) & (places <= high)
    x = Axis(low, high, LEFT, RIGHT)
    y = Axis(*_heights(np.concatenate([f.hazard_ratio[shown] for f in found])), BOTTOM, top_of(len(targets)))
    sentences = [_sentence(t.name, t.answer) for t in targets]
    if viewing is not None:
        ratios = [t.answer.at_distance.hazard_ratio for t in targets if t.answer.at_distance]
        sentences.append(f"At {plain(viewing)} m: {_ratios_said(names, ratios)} the limit.")
    if result.scan is not None:
        stopped = _sentence("Eye when the sweep stops", result.scan.failure_eye)
        sentences.append(f"All of this holds while the beam sweeps. {stopped}")
    plot = Plot(
        id="distance-chart",
        title="Exposure over limit against distance",
        description=f"Logarithmic axes, distance {plain(low)} m to {plain(high)} m. {' '.join(sentences)}",
        x=x,
        y=y,
        x_title="Distance from the exit or the last element, m",
        y_title="Exposure / limit",
        curves=_curves(targets, [(places[shown], f.hazard_ratio[shown]) for f in found], x, y),
        zones=[
            zone(t.kind, t.name, lane, x, t.answer.hazard_zone_m, _zone_label(t.answer))
            for lane, t in enumerate(targets)
        ],
        marks=[] if viewing is None else [mark(x, viewing, f"viewing {plain(viewing)} m")],
        limit=y.at(1.0),
        readings=_readings(names, places, found, read, x, y),
        reader="Read the chart at a distance",
    )
    return Chart(plot, names, sentences, _rows(places, found, listed, viewing))


def _curves(targets: list[_Target], pairs: list[tuple[Floats, Floats]], x: Axis, y: Axis) -> list[Curve]:
    """The curves, the eye drawn last; the higher of two has its name above, the aided one further on."""
    first = [float(ratio[0]) for _, ratio in pairs]
    above = [first[0] >= first[1], first[0] < first[1], True]
    return [
        curve(t.kind, t.name, x, y, list(zip(*pair, strict=True)), up, 0.16 if t.kind == "aided" else 0.02)
        for t, pair, up in reversed(list(zip(targets, pairs, above, strict=False)))
    ]


def _readings(
    names: list[str], places: Floats, found: list[TargetAlong], read: Floats, x: Axis, y: Axis
) -> list[Reading]:
    readings = []
    for k in np.searchsorted(places, read).tolist():
        ratios = [float(f.hazard_ratio[k]) for f in found]
        heights = [y.at(r) if r >= y.low else None for r in ratios]
        words = f"{plain(float(places[k]))} m: {_ratios_said(names, ratios)} the limit"
        readings.append(Reading(x.at(float(places[k])), words, heights))
    return readings


def _rows(places: Floats, found: list[TargetAlong], listed: list[float], viewing: float | None) -> list[Row]:
    rows = []
    for distance, k in zip(listed, np.searchsorted(places, listed).tolist(), strict=True):
        figures = [
            (float(f.hazard_ratio[k]), float(f.exposure_j_m2[k]), float(f.limit_j_m2[k])) for f in found
        ]
        rows.append(Row(distance, distance == viewing, figures))
    return rows
