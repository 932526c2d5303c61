"""Measured values in place of a data sheet's: the request and the answer."""

from __future__ import annotations

from typing import Any, Literal

from pydantic import ConfigDict, Field, model_validator

from service.contract.beam import AnyBeam, Diameter
from service.contract.bounds_result import Outcome
from service.contract.request import MAX_LABEL, PulseDuration, Rate, Strict, Wavelength
from service.contract.result import Model, Notice

__all__ = ["AxisFit", "MeasuredRequest", "MeasuredResult", "Point", "Reading", "Value"]

MAX_POINTS = 200
QUANTITIES = ("power_w", "energy_j", "irradiance_w_m2", "radiant_exposure_j_m2")


class Reading(Strict):
    """What an instrument behind an aperture showed.

    Power or energy that passed, or irradiance or radiant exposure averaged over the aperture. The
    uncertainty is the instrument's expanded one (95 %).
    """

    quantity: Literal["power_w", "energy_j", "irradiance_w_m2", "radiant_exposure_j_m2"]
    value: float = Field(gt=0, le=1e15, description="As read, in the unit of the quantity; of one pulse.")
    aperture_mm: float = Field(ge=1e-3, le=1e5, description="Diameter of the aperture in millimetres.")
    distance_m: float = Field(
        0.0, ge=0, le=1e6, description="Distance of the aperture from the exit in metres."
    )
    uncertainty_percent: float = Field(
        0.0, ge=0, le=60, description="Expanded uncertainty (95 %) of the instrument in per cent."
    )


class Point(Strict):
    """A second-moment (1/e2) beam diameter at a distance from the exit."""

    distance_m: float = Field(ge=-1e6, le=1e6, description="Distance from the exit in metres.")
    diameter_mm: Diameter
    uncertainty_mm: float | None = Field(
        None, gt=0, le=1e5, description="Expanded uncertainty (95 %) of this diameter by itself."
    )


class MeasuredRequest(Strict):
    """One laser line as measured: a reading behind an aperture, and the beam by diameters or as given."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "label": "Bench 4, measured",
                    "wavelength_nm": 532,
                    "reading": {
                        "quantity": "power_w",
                        "value": 0.081,
                        "aperture_mm": 10.0,
                        "distance_m": 1.0,
                        "uncertainty_percent": 5,
                    },
                    "points": [
                        {"distance_m": 0.2, "diameter_mm": 1.01},
                        {"distance_m": 0.5, "diameter_mm": 1.12},
                        {"distance_m": 1.0, "diameter_mm": 1.41},
                        {"distance_m": 2.0, "diameter_mm": 2.24},
                        {"distance_m": 4.0, "diameter_mm": 4.12},
                    ],
                    "diameter_uncertainty_percent": 2,
                }
            ]
        }
    )

    label: str = Field("", max_length=MAX_LABEL, description="Your name for this laser.")
    rules: str = Field("icnirp-2013", max_length=100, description="Rule set id; see GET /api/v1/rules.")
    exposure_s: float | None = Field(None, ge=1e-13, le=3e4, description="Exposure duration in seconds.")
    wavelength_nm: Wavelength
    pulse_s: PulseDuration | None = Field(None, description="Pulse duration; left out: continuous.")
    rate_hz: Rate | None = Field(None, description="Repetition rate; left out: a single pulse.")
    reading: Reading
    points: list[Point] = Field(
        default_factory=list, max_length=MAX_POINTS, description="Diameters along the beam, fitted to a beam."
    )
    diameter_uncertainty_percent: float = Field(
        0.0, ge=0, le=60, description="Expanded uncertainty (95 %) that all diameters share, in per cent."
    )
    beam: AnyBeam | None = Field(None, description="The beam, where no diameters were measured along it.")

    @model_validator(mode="after")
    def _fits_together(self) -> MeasuredRequest:
        if (self.beam is None) == (not self.points):
            raise ValueError("give points, or beam, one of the two")
        if self.rate_hz is not None and self.pulse_s is None:
            raise ValueError("a repetition rate needs pulse_s too")
        per_pulse = self.reading.quantity in ("energy_j", "radiant_exposure_j_m2")
        if per_pulse and self.pulse_s is None:
            raise ValueError("an energy needs pulse_s too")
        if not per_pulse and self.pulse_s is not None and self.rate_hz is None:
            raise ValueError(
                "the power of a pulsed laser needs rate_hz too; of a single pulse give the energy"
            )
        own = [p.uncertainty_mm is not None for p in self.points]
        if any(own) and not all(own):
            raise ValueError("give uncertainty_mm for every point or for none")
        return self


class Value(Model):
    """A figure with its expanded uncertainty (95 %)."""

    value: float
    uncertainty: float


class AxisFit(Model):
    """The fitted beam along one axis."""

    axis: Literal["both", "x", "y"]
    waist_diameter_mm: Value
    waist_m: Value
    divergence_mrad: Value
    m2: Value
    rayleigh_m: float
    residuals_mm: list[float]


class MeasuredResult(Model):
    """What was measured, as an evaluation and as one with tolerances."""

    fits: list[AxisFit]
    fraction: float = Field(description="Share of the beam that passed the aperture, from the beam.")
    through: float = Field(description="Power [W] or energy [J] that passed the aperture.")
    total: Value = Field(description="Power [W] or energy [J] of the whole beam.")
    unit: Literal["W", "J"]
    evaluation: dict[str, Any] = Field(description="Body for POST /api/v1/evaluate.")
    outcome: Outcome
    tolerance: dict[str, Any] | None = Field(
        description="Body for POST /api/v1/tolerance with the uncertainties; null where there are none."
    )
    inputs: dict[str, Any]
    notices: list[Notice]
    cautions: list[str]
    service_version: str
