"""The request of contract v1: validated, SI with the unit in the name, unknown fields refused."""

from __future__ import annotations

import math
from typing import Annotated, Any, Literal

from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    PlainSerializer,
    WithJsonSchema,
    field_validator,
    model_validator,
)

from service.assess.marking import parse_marking

__all__ = [
    "MAX_LINES",
    "Beam",
    "Emission",
    "EvaluationRequest",
    "Eyewear",
    "EyewearRange",
    "Line",
    "Viewing",
    "Window",
]

MAX_LINES = 16
MAX_LABEL = 200
MAX_PAIRS = 20
#: Smallest divergence other than none [mrad]; no source of light spreads less.
LEAST_MRAD = 1e-6
#: Smallest beam diameter [mm].
LEAST_MM = 1e-4


class Strict(BaseModel):
    """Refuses unknown fields, text for numbers, NaN and infinity; cannot be changed afterwards."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True, allow_inf_nan=False)


def _pair(value: Any) -> Any:
    """A number stands for both axes."""
    if isinstance(value, list):
        return tuple(value)
    return value if isinstance(value, tuple) else (value, value)


def _unpair(value: tuple[float, float]) -> float | list[float]:
    return value[0] if value[0] == value[1] else list(value)


def _pair_schema(minimum: dict[str, float], maximum: float) -> WithJsonSchema:
    number = {"type": "number", **minimum, "maximum": maximum}
    return WithJsonSchema(
        {"anyOf": [number, {"type": "array", "items": number, "minItems": 2, "maxItems": 2}]}
    )


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


def _not_tiny(value: float) -> float:
    if 0.0 < value < LEAST_MRAD:
        raise ValueError(f"an angle below {LEAST_MRAD:g} mrad; use 0 for a beam without spread")
    return value


Angle = Annotated[float, Field(ge=0, le=3141), AfterValidator(_not_tiny)]
Diameter = Annotated[
    tuple[Annotated[float, Field(ge=LEAST_MM, le=1e5)], Annotated[float, Field(ge=LEAST_MM, le=1e5)]],
    BeforeValidator(_pair),
    PlainSerializer(_unpair),
    _pair_schema({"minimum": LEAST_MM}, 1e5),
    Field(description="Beam diameter in millimetres; a number, or [x, y] for an elliptical beam."),
]
Divergence = Annotated[
    tuple[Angle, Angle],
    BeforeValidator(_pair),
    PlainSerializer(_unpair),
    _pair_schema({"minimum": 0}, 3141),
    Field(description="Full-angle divergence in milliradians; a number, or [x, y]."),
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


class Beam(Strict):
    """A beam by its waist and far-field divergence, both at the level named."""

    profile: Literal["gaussian", "tophat"] = Field(
        "gaussian", description="Gaussian, or uniform (top hat, for which the level does not matter)."
    )
    diameter_mm: Diameter
    divergence_mrad: Divergence
    level: Literal["1/e", "1/e2"] = Field(
        "1/e2", description="Level at which diameter and divergence are given: 1/e or 1/e2 of the peak."
    )
    diameter_at: Literal["waist", "exit"] = Field(
        "waist", description="Where the diameter is given; without waist_m both are the same place."
    )
    waist_m: float = Field(
        0.0,
        ge=-1e6,
        le=1e6,
        description="Position of the waist in metres, positive downstream of the exit.",
    )

    def waist_diameters_mm(self) -> tuple[float, float]:
        """Diameters at the waist [mm]: d0^2 = d^2 - (divergence x waist)^2 where given at the exit."""
        if self.diameter_at == "waist":
            return self.diameter_mm
        axes = zip(self.diameter_mm, self.divergence_mrad, strict=True)
        x, y = (d * d - (phi * self.waist_m) ** 2 for d, phi in axes)
        return math.sqrt(max(x, 0.0)), math.sqrt(max(y, 0.0))

    @model_validator(mode="after")
    def _waist_is_possible(self) -> Beam:
        if min(self.waist_diameters_mm()) < LEAST_MM:
            raise ValueError(
                "the beam is narrower at the exit than the divergence and the way to the waist make it there"
            )
        return self


class Line(Strict):
    """One emission line."""

    wavelength_nm: Wavelength
    emission: Emission
    beam: Beam
    subtense_mrad: float = Field(
        1.5,
        ge=0,
        le=3141,
        description="Angular subtense of the apparent source in milliradians; below 1.5 counts as 1.5.",
    )


class Viewing(Strict):
    """Who looks, from where."""

    distance_m: float | None = Field(
        None, ge=0, le=1e9, description="Evaluate at this distance in metres from the last element too."
    )


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
    bench: list[Any] = Field(
        default_factory=list, max_length=0, description="Elements in the beam. Empty: the direct beam."
    )
    viewing: Viewing = Field(default_factory=Viewing)
    eyewear: list[Eyewear] = Field(
        default_factory=list, max_length=MAX_PAIRS, description="Pairs to judge against this laser."
    )
    windows: list[Window] = Field(
        default_factory=list, max_length=MAX_PAIRS, description="Windows and screens to judge."
    )
