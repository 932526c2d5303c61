"""The request of contract v1: validated, SI with the unit in the name, unknown fields refused."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import (
    AfterValidator,
    ConfigDict,
    Field,
    field_validator,
    model_validator,
)

from service.assess.marking import parse_marking
from service.contract.beam import AnyBeam
from service.contract.bench import Element, last_is_last
from service.contract.strict import Strict

__all__ = [
    "MAX_LINES",
    "Aid",
    "Emission",
    "EvaluationRequest",
    "Eyewear",
    "EyewearRange",
    "Line",
    "Strict",
    "Viewing",
    "Window",
]

MAX_LINES = 16
MAX_LABEL = 200
MAX_PAIRS = 20
MAX_ELEMENTS = 32


Wavelength = Annotated[
    float, Field(ge=180, le=1e6, description="Vacuum wavelength in nanometres.", examples=[532])
]
Power = Annotated[float, Field(ge=1e-15, le=1e12, description="Power in watts.", examples=[0.1])]
Energy = Annotated[
    float, Field(ge=1e-21, le=1e9, description="Energy of one pulse in joules.", examples=[1e-3])
]
PulseDuration = Annotated[
    float, Field(ge=1e-13, le=3e4, description="Pulse duration in seconds.", examples=[1e-8])
]
Rate = Annotated[
    float, Field(ge=1e-6, le=1e13, description="Pulse repetition rate in hertz.", examples=[1000])
]


class Cw(Strict):
    """Continuous wave."""

    mode: Literal["cw"]
    power_w: Power


class Pulse(Strict):
    """One pulse."""

    mode: Literal["pulse"]
    energy_j: Energy
    pulse_s: PulseDuration


class Train(Strict):
    """Regular pulses. Give the energy of a pulse or the average power, not both."""

    mode: Literal["train"]
    energy_j: Energy | None = None
    pulse_s: PulseDuration
    rate_hz: Rate
    average_power_w: Power | None = None

    @model_validator(mode="after")
    def _one_of_two(self) -> Train:
        if (self.energy_j is None) == (self.average_power_w is None):
            raise ValueError("give energy_j or average_power_w, one of the two")
        if not 1e-21 <= self.pulse_energy_j <= 1e9:
            raise ValueError("average_power_w / rate_hz gives an energy per pulse outside 1e-21 to 1e9 J")
        return self

    @property
    def pulse_energy_j(self) -> float:
        """Energy of one pulse [J], from the average power and the rate where that was given."""
        if self.energy_j is not None:
            return self.energy_j
        assert self.average_power_w is not None
        return self.average_power_w / self.rate_hz


Emission = Annotated[Cw | Pulse | Train, Field(discriminator="mode")]


class Line(Strict):
    """One emission line."""

    wavelength_nm: Wavelength
    emission: Emission
    output_mirror_reflectance: float | None = Field(
        None,
        ge=0,
        le=0.999999,
        description="Resonator open: the beam is the one-way circulating one, emission / (1 - this).",
    )
    beam: AnyBeam
    subtense_mrad: float = Field(
        1.5,
        ge=0,
        le=3141,
        description="Angular subtense of the apparent source in milliradians; below 1.5 counts as 1.5.",
    )


class Aid(Strict):
    """Optics in front of the eye; they count from 302.5 to 4000 nm."""

    objective_mm: float = Field(ge=1, le=10000)
    magnification: float = Field(ge=1, le=1000)
    transmittance: float = Field(1.0, gt=0, le=1, description="1 is the strictest.")


class OverDistance(Strict):
    """Places for results over distance, evenly spread over the powers of ten."""

    from_m: float = Field(gt=1e-6, le=1e9)
    to_m: float = Field(gt=1e-6, le=1e9)
    points: int = Field(50, ge=2, le=1000)

    @model_validator(mode="after")
    def _ascending(self) -> OverDistance:
        if self.to_m <= self.from_m:
            raise ValueError("to_m must lie beyond from_m")
        return self


class Viewing(Strict):
    """Who looks, from where."""

    distance_m: float | None = Field(
        None, ge=0, le=1e9, description="Evaluate at this distance in metres from the last element too."
    )
    visibility_km: float | None = Field(
        None,
        ge=0.05,
        le=1000,
        description="Visibility at a contrast of 2 %, 1.3 times the meteorological optical range (5 %); "
        "without it the air is clear (stricter).",
    )
    aid: Aid | None = Field(None, description="Binoculars, a telescope or a loupe between beam and eye.")
    outdoors: bool | None = Field(
        None, description="Ask how far the beam disturbs pilots (visual interference with aircraft)."
    )
    over_distance: OverDistance | None = Field(None, description="Ask for exposure and ratio over distance.")


class EyewearRange(Strict):
    """What a pair offers in one band: an optical density, a marking, or both."""

    from_nm: Wavelength
    to_nm: Wavelength
    optical_density: float | None = Field(None, ge=0, le=20)
    marking: str | None = Field(
        None,
        max_length=MAX_LABEL,
        description="Marking in the standards' notation: D LB5 + IR LB6, or RB2. A wavelength range in it "
        "narrows the band.",
    )

    @model_validator(mode="after")
    def _says_something(self) -> EyewearRange:
        if self.to_nm < self.from_nm:
            raise ValueError("to_nm lies below from_nm")
        if self.optical_density is None and self.marking is None:
            raise ValueError("give optical_density, marking, or both")
        return self

    @field_validator("marking")
    @classmethod
    def _readable(cls, value: str | None) -> str | None:
        if value is not None:
            parse_marking(value)
        return value


class Eyewear(Strict):
    """A pair of eyewear."""

    name: str = Field(min_length=1, max_length=MAX_LABEL)
    ranges: list[EyewearRange] = Field(min_length=1, max_length=20)
    luminous_transmittance: float | None = Field(
        None, gt=0, le=1, description="Share of daylight that passes, 0 to 1."
    )


class Window(Strict):
    """A viewing window, filter, enclosure wall or screen at a distance."""

    name: str = Field(min_length=1, max_length=MAX_LABEL)
    distance_m: float = Field(ge=0, le=1e9, description="Distance from the last element in metres.")
    optical_density: float | None = Field(None, ge=0, le=20, description="At every wavelength of the laser.")


class EvaluationRequest(Strict):
    """One laser: its lines, the rule set and the exposure."""

    model_config = ConfigDict(
        json_schema_extra={
            "examples": [
                {
                    "label": "Bench 4 alignment beam",
                    "rules": "icnirp-2013",
                    "exposure_s": 0.25,
                    "lines": [
                        {
                            "wavelength_nm": 532,
                            "emission": {"mode": "cw", "power_w": 0.1},
                            "beam": {
                                "profile": "gaussian",
                                "diameter_mm": 2.0,
                                "divergence_mrad": 1.0,
                                "level": "1/e2",
                            },
                            "subtense_mrad": 1.5,
                        }
                    ],
                    "bench": [],
                    "viewing": {},
                }
            ]
        }
    )

    label: str = Field("", max_length=MAX_LABEL, description="Your name for this laser.")
    rules: str = Field("icnirp-2013", max_length=100, description="Rule set id; see GET /api/v1/rules.")
    basis: Literal["measured", "data_sheet", "bound"] | None = Field(
        None,
        description="Where the figures come from: measured, a data sheet, or bounds of a laser that nobody "
        "has measured; bounds are told with every answer.",
    )
    exposure_s: float | None = Field(
        None,
        ge=1e-13,
        le=3e4,
        description="Exposure duration T in seconds. Without it each line takes the rule set's "
        "conventional duration for an unintended exposure at its wavelength.",
    )
    lines: list[Line] = Field(min_length=1, max_length=MAX_LINES, description="1 to 16 emission lines.")
    bench: Annotated[list[Element], AfterValidator(last_is_last)] = Field(
        default_factory=list,
        max_length=MAX_ELEMENTS,
        description="What the light meets, in order. Distances are measured from the last element.",
    )
    viewing: Viewing = Field(default_factory=Viewing)
    eyewear: list[Eyewear] = Field(
        default_factory=list, max_length=MAX_PAIRS, description="Pairs to judge against this laser."
    )
    windows: list[Window] = Field(
        default_factory=list, max_length=MAX_PAIRS, description="Windows and screens to judge."
    )
