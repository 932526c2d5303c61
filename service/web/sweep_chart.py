"""The charts of a sweep: hazard distance, exposure over limit, and the limit itself."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from service.contract.request import Cw
from service.contract.sweep import SweepAnswer
from service.web.axes import Axis, decades
from service.web.chart import request_of
from service.web.numbers import plain, shown_down, shown_up
from service.web.plot import BOTTOM, LEFT, RIGHT, Plot, Reading, curve, mark, top_of

__all__ = ["LABELS", "plots_of", "unit_of"]

LABELS = {
    "wavelength_nm": "Wavelength",
    "power_w": "Power",
    "energy_j": "Energy of a pulse",
    "average_power_w": "Average power",
    "pulse_s": "Pulse duration",
    "rate_hz": "Repetition rate",
    "diameter_mm": "Beam diameter",
    "divergence_mrad": "Divergence",
    "exposure_s": "Exposure duration",
}
#: Class of each target's curve, and how far along its name stands.
KINDS = {"eye": "eye", "skin": "skin", "eye_aided": "aided"}
PLACES = {"eye": 0.02, "skin": 0.02, "eye_aided": 0.16}
#: Most readings of one chart.
READINGS = 101
Figures = Sequence[float | None]


def unit_of(field: str) -> str:
    """The unit that a field's name ends with."""
    return {"w": "W", "j": "J", "hz": "Hz"}.get(field.rpartition("_")[2], field.rpartition("_")[2])


def plots_of(answer: SweepAnswer, as_set: float | None) -> list[Plot]:
    """The charts that have something to show; `as_set` is the value of the laser itself."""
    lines = request_of(answer.inputs).lines
    continuous = isinstance(lines[min(answer.sweep.line, len(lines) - 1)].emission, Cw)
    limit, unit = ("limit_w_m2", "W/m²") if continuous else ("limit_j_m2", "J/m²")
    wanted = [
        ("distance", "Hazard distance", "m", "hazard_distance_m", shown_up, False),
        ("ratio", "Exposure / limit at the worst place", "", "hazard_ratio", shown_up, True),
        ("limit", "Governing limit", unit, limit, shown_down, False),
    ]
    plots = []
    for key, name, y_unit, column, shown, against_limit in wanted:
        drawn = [(k, n, _drawable(getattr(t, column))) for k, n, t in answer.targets()]
        if any(v is not None for *_, figures in drawn for v in figures):
            plots.append(_plot(answer, as_set, key, name, y_unit, column, drawn, shown, against_limit))
    return plots


def _drawable(values: Figures) -> list[float | None]:
    """What a logarithmic axis can show: nothing at 0 and nothing without end."""
    return [v if v else None for v in values]


def _plot(
    answer: SweepAnswer,
    as_set: float | None,
    key: str,
    name: str,
    unit: str,
    column: str,
    drawn: list[tuple[str, str, list[float | None]]],
    shown: Callable[[float], str],
    against_limit: bool,
) -> Plot:
    asked, values = answer.sweep, answer.values
    x = Axis(asked.start, asked.stop, LEFT, RIGHT, asked.spacing == "log")
    found = [v for *_, figures in drawn for v in figures if v is not None]
    low, high = decades(min(found) / 1.2, max(found) * 1.2)
    if against_limit:
        low, high = min(low, 0.1), max(high, 10.0)
    low = max(low, high * 1e-15)
    y = Axis(low, high, BOTTOM, top_of(0))
    field = f"{LABELS[asked.field]}, {unit_of(asked.field)}"
    y_title = f"{name}, {unit}" if unit else name
    eye_first = _first(drawn[0][2]) >= _first(drawn[1][2])
    above = {"eye": eye_first, "skin": not eye_first, "eye_aided": True}
    curves = [
        curve(KINDS[k], n, x, y, list(zip(values, figures, strict=True)), above[k], PLACES[k])
        for k, n, figures in reversed(drawn)
    ]
    return Plot(
        id=f"sweep-{key}",
        title=f"{name} against {LABELS[asked.field].lower()}",
        description=f"{field}, from {plain(asked.start)} to {plain(asked.stop)}. "
        + " ".join(_range_words(n, v, unit, shown) for _, n, v in drawn),
        x=x,
        y=y,
        x_title=field,
        y_title=y_title,
        curves=curves,
        marks=[] if as_set is None else [mark(x, as_set, f"as set {plain(as_set)} {unit_of(asked.field)}")],
        limit=y.at(1.0) if against_limit else None,
        readings=_readings(answer, x, y, unit, column, shown),
        reader=f"Read the chart at a {LABELS[asked.field].lower()}",
    )


def _first(values: Figures) -> float:
    return next((v for v in values if v is not None), 0.0)


def _range_words(name: str, values: Figures, unit: str, shown: Callable[[float], str]) -> str:
    found = [v for v in values if v is not None]
    if not found:
        return f"{name}: none."
    return f"{name}: {shown(min(found))} to {shown(max(found))} {unit}".rstrip() + "."


def _readings(
    answer: SweepAnswer, x: Axis, y: Axis, unit: str, column: str, shown: Callable[[float], str]
) -> list[Reading]:
    every = -(-len(answer.values) // READINGS)
    lists: list[tuple[str, Figures]] = [(n.lower(), getattr(t, column)) for _, n, t in answer.targets()]
    readings = []
    for k in range(0, len(answer.values), every):
        heights = [y.at(v) if v and v >= y.low else None for v in (figures[k] for _, figures in lists)]
        words = ", ".join(f"{name} {_word(figures[k], unit, shown)}" for name, figures in lists)
        at = f"{plain(answer.values[k])} {unit_of(answer.sweep.field)}"
        readings.append(Reading(x.at(answer.values[k]), f"{at}: {words}", heights))
    return readings


def _word(value: float | None, unit: str, shown: Callable[[float], str]) -> str:
    if value is None:
        return "without end"
    return f"{shown(value)} {unit}".strip() if value else "none"
