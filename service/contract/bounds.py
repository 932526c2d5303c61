"""Bounds for a laser that nobody has measured: the request."""

from __future__ import annotations

from typing import Literal

from pydantic import ConfigDict, Field, model_validator

from service.contract.request import MAX_LABEL, Strict

__all__ = ["BoundsRequest", "OutputBeam", "Pump", "QSwitch", "Resonator"]


class Pump(Strict):
    """What pumps the medium: a constant power, or pulses. Pulses may repeat."""

    mode: Literal["cw", "pulse"] = "cw"
    power_w: float | None = Field(
        None, ge=1e-9, le=1e9, description="Pump power in watts, all of it that can reach the medium."
    )
    energy_j: float | None = Field(
        None,
        ge=1e-12,
        le=1e9,
        description="Energy of one pump pulse in joules, all that can reach the medium.",
    )
    pulse_s: float | None = Field(
        None, ge=1e-13, le=1e3, description="Duration of the pump pulse in seconds."
    )
    rate_hz: float | None = Field(
        None,
        ge=1e-6,
        le=1e9,
        description="Repetition rate of the pump pulses in hertz; none: a single pulse.",
    )
    absorbed_fraction: float = Field(
        1.0, gt=0, le=1, description="Most that the medium can absorb; 1 where it was not measured."
    )
    leak_fraction: float = Field(
        1.0,
        ge=0,
        le=1,
        description="Most of the pump light that can leave the housing; 1 where it was not measured.",
    )

    @model_validator(mode="after")
    def _what_the_mode_needs(self) -> Pump:
        pulsed = (self.energy_j, self.pulse_s)
        if self.mode == "cw" and (self.power_w is None or pulsed != (None, None) or self.rate_hz is not None):
            raise ValueError("a continuous pump needs power_w, and no energy_j, pulse_s or rate_hz")
        if self.mode == "pulse" and (None in pulsed or self.power_w is not None):
            raise ValueError("a pulsed pump needs energy_j and pulse_s, and no power_w")
        if self.rate_hz is not None and self.pulse_s is not None and self.rate_hz * self.pulse_s > 1.0:
            raise ValueError("the pump pulses would overlap: pulse_s x rate_hz is above 1")
        return self


class Resonator(Strict):
    """Mirrors, losses and sizes."""

    length_mm: float = Field(
        ge=1e-3, le=1e7, description="Optical length between the mirrors, one way, in millimetres."
    )
    output_reflectance: float = Field(gt=0, lt=1, description="Reflectance of the output mirror, 0 to 1.")
    rear_reflectance: float = Field(1.0, gt=0, le=1, description="Reflectance of the rear mirror, 0 to 1.")
    loss: float = Field(0.0, ge=0, lt=1, description="Other loss per round trip, 0 to 1.")
    mode_diameter_mm: float = Field(
        ge=1e-3, le=1e4, description="Diameter (1/e2) of the laser mode in the medium in millimetres."
    )
    medium_length_mm: float = Field(ge=1e-3, le=1e7, description="Length of the medium in millimetres.")
    medium_diameter_mm: float | None = Field(
        None,
        ge=1e-3,
        le=1e4,
        description="Diameter of the pumped medium in millimetres. With the density it limits what can be "
        "stored; without it nothing does but the pump.",
    )


class QSwitch(Strict):
    """A Q-switch, or whatever opens the resonator at once."""

    rate_hz: float | None = Field(
        None, ge=1e-6, le=1e9, description="Pulse rate in hertz; none: one pulse, or one for each pump pulse."
    )
    open_s: float = Field(1e-6, ge=0, le=1.0, description="How long the switch stays open, in seconds.")


class OutputBeam(Strict):
    """The beam outside. Left out: as wide as the mode, and as parallel as diffraction allows."""

    diameter_mm: float | None = Field(
        None, ge=1e-4, le=1e5, description="Beam diameter (1/e2) at the exit in millimetres."
    )
    divergence_mrad: float | None = Field(
        None, ge=1e-6, le=3141, description="Full-angle divergence (1/e2) in milliradians."
    )
    pump_divergence_mrad: float | None = Field(
        None,
        ge=1e-6,
        le=3141,
        description="Full-angle divergence of pump light that leaks out, in milliradians; left out: as "
        "parallel as the laser beam.",
    )


class BoundsRequest(Strict):
    """An unmeasured laser by its pump, medium and resonator. A figure given here replaces the medium's."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "label": "Rod laser on table 3",
                    "medium": "nd-yag",
                    "pump": {"mode": "cw", "power_w": 20.0},
                    "resonator": {
                        "length_mm": 250.0,
                        "output_reflectance": 0.9,
                        "mode_diameter_mm": 0.8,
                        "medium_length_mm": 50.0,
                    },
                    "q_switch": {"rate_hz": 5000.0},
                }
            ]
        }
    )

    label: str = Field("", max_length=MAX_LABEL, description="Your name for this laser.")
    rules: str = Field("icnirp-2013", max_length=100, description="Rule set id for the evaluations.")
    medium: str | None = Field(
        None, max_length=100, description="Key of a gain medium; see GET /api/v1/gain-media."
    )
    levels: Literal[2, 3, 4] | None = Field(
        None, description="Number of levels; 3 also for quasi-three-level."
    )
    lower_ratio: float | None = Field(
        None,
        ge=0,
        le=1,
        description="Absorption cross-section over emission cross-section at the laser wavelength: 1 with "
        "three levels, 0 with four, between for quasi-three-level media.",
    )
    wavelength_nm: float | None = Field(None, ge=180, le=1e6, description="Laser wavelength in nanometres.")
    pump_wavelength_nm: float | None = Field(
        None,
        ge=10,
        le=1e6,
        description="Pump wavelength in nanometres; for a discharge that of a photon of the pumping energy.",
    )
    lifetime_s: float | None = Field(
        None, ge=1e-12, le=1.0, description="Lifetime of the upper level in seconds."
    )
    cross_section_cm2: float | None = Field(
        None, ge=1e-24, le=1e-10, description="Stimulated emission cross-section in cm2."
    )
    density_cm3: float | None = Field(None, ge=1e6, le=1e23, description="Density of active ions per cm3.")
    quantum_yield: float | None = Field(
        None, ge=0.01, le=2.0, description="Laser photons that one absorbed pump photon can give at most."
    )
    pump: Pump
    resonator: Resonator
    q_switch: QSwitch | None = None
    beam: OutputBeam = Field(default_factory=lambda: OutputBeam.model_validate({}))

    @model_validator(mode="after")
    def _one_rate(self) -> BoundsRequest:
        if self.pump.mode == "pulse" and self.q_switch is not None and self.q_switch.rate_hz is not None:
            raise ValueError(
                "with a pulsed pump the Q-switch follows pump.rate_hz; leave q_switch.rate_hz out"
            )
        return self
