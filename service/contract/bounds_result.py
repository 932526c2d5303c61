"""Bounds for a laser that nobody has measured: the answer."""

from __future__ import annotations

from typing import Any, Literal

from pydantic import Field

from service.contract.result import Known, Model, Notice

__all__ = ["BoundsResult", "Curve", "Figure", "GainMediumDocument", "MediumFigure", "Outcome", "Scenario"]


class MediumFigure(Model):
    """A figure of the medium and where it comes from."""

    quantity: str
    words: str
    value: float | None = Field(description="null = not known.")
    unit: str
    source: str
    known: Known


class GainMediumDocument(Model):
    """A gain medium with its rows."""

    key: str
    name: str
    host: str
    figures: list[MediumFigure]


class Figure(Model):
    """A bound or a computed figure."""

    symbol: str
    name: str
    value: float | None = Field(description="null = without bound.")
    unit: str
    kind: Literal["upper bound", "lower bound", "computed"]
    text: str = Field(description="How it follows.")
    source: str


class Outcome(Model):
    """What an evaluation comes to, in short; null = unbounded."""

    eye_hazard_distance_m: float | None
    eye_hazard_ratio: float
    eye_optical_density: float
    skin_hazard_distance_m: float | None
    hazard_class: str


class Scenario(Model):
    """A way in which the laser may run, as an evaluation of bounds."""

    id: Literal["running", "first_pulse", "pulse_train"]
    title: str
    text: str
    evaluation: dict[str, Any] = Field(description="Body for POST /api/v1/evaluate.")
    outcome: Outcome


class Curve(Model):
    """A solution of the rate equations over time."""

    time_s: list[float]
    upper_ions: list[float]
    inversion: list[float] = Field(description="Inversion over its value at threshold.")
    output_w: list[float] = Field(description="Power through the output mirror in watts.")


class BoundsResult(Model):
    """Bounds, ways to run, and the rate equations behind them."""

    label: str = Field(description="Carries 'bound, not measured'.")
    inputs: dict[str, Any]
    medium: list[MediumFigure]
    bounds: list[Figure]
    computed: list[Figure] = Field(description="Solutions of the rate equations; no bounds.")
    scenarios: list[Scenario]
    switch_on: Curve = Field(description="Pump switched on at time 0.")
    q_switch: Curve | None = Field(description="Resonator opened at time 0; null below threshold.")
    notices: list[Notice]
    cautions: list[str]
    service_version: str
    media_digest: str
