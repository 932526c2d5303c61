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
        eye, skin = (_drawable(getattr(t, column)) for t in (answer.eye, answer.skin))
        if any(v is not None for v in (*eye, *skin)):
            plots.append(_plot(answer, as_set, key, name, y_unit, column, eye, skin, shown, against_limit))
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
    eye: Figures,
    skin: Figures,
    shown: Callable[[float], str],
    against_limit: bool,
) -> Plot:
    asked, values = answer.sweep, answer.values
    x = Axis(asked.start, asked.stop, LEFT, RIGHT, asked.spacing == "log")
    found = [v for v in (*eye, *skin) if v is not None]
    low, high = decades(min(found) / 1.2, max(found) * 1.2)
    if against_limit:
        low, high = min(low, 0.1), max(high, 10.0)
    low = max(low, high * 1e-15)
    y = Axis(low, high, BOTTOM, top_of(0))
    field = f"{LABELS[asked.field]}, {unit_of(asked.field)}"
    eye_first = _first(eye) >= _first(skin)
    y_title = f"{name}, {unit}" if unit else name
    curves = [
        curve("skin", "Skin", x, y, list(zip(values, skin, strict=True)), not eye_first),
        curve("eye", "Eye", x, y, list(zip(values, eye, strict=True)), eye_first),
    ]
    return Plot(
        id=f"sweep-{key}",
        title=f"{name} against {LABELS[asked.field].lower()}",
        description=f"{field}, from {plain(asked.start)} to {plain(asked.stop)}. "
        + " ".join(_range_words(n, v, unit, shown) for n, v in (("Eye", eye), ("Skin", skin))),
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
    lists: tuple[Figures, Figures] = getattr(answer.eye, column), getattr(answer.skin, column)
    readings = []
    for k in range(0, len(answer.values), every):
        pair = [figures[k] for figures in lists]
        heights = [y.at(v) if v and v >= y.low else None for v in pair]
        eye, skin = (_word(v, unit, shown) for v in pair)
        at = f"{plain(answer.values[k])} {unit_of(answer.sweep.field)}"
        readings.append(Reading(x.at(answer.values[k]), f"{at}: eye {eye}, skin {skin}", heights))
    return readings


def _word(value: float | None, unit: str, shown: Callable[[float], str]) -> str:
    if value is None:
        return "without end"
    return f"{shown(value)} {unit}".strip() if value else "none"
