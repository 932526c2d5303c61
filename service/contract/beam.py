"""The beam of a line: by waist and divergence, or out of a fibre end."""

from __future__ import annotations

import math
from typing import Annotated, Any, Literal, NamedTuple

from pydantic import (
    AfterValidator,
    BeforeValidator,
    Discriminator,
    Field,
    PlainSerializer,
    Tag,
    WithJsonSchema,
    model_validator,
)

from service.contract.strict import Strict
from service.optics.beams import SQRT2

__all__ = ["KINDS", "AnyBeam", "Beam", "FibreMultimode", "FibreSingleMode", "Moments"]

#: Smallest divergence other than none [mrad]; no source of light spreads less.
LEAST_MRAD = 1e-6
#: Smallest beam diameter [mm].
LEAST_MM = 1e-4
#: Numerical aperture at the 5 % points over the 1/e half angle (IEC 60825-2 practice, from memory).
NA_OVER_HALF_ANGLE = 1.7


class Moments(NamedTuple):
    """1/e diameters [m] and full 1/e angles [rad] of both axes, waist position [m]."""

    tophat: bool
    diameter_x_m: float
    diameter_y_m: float
    divergence_x_rad: float
    divergence_y_rad: float
    waist_m: float


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

    def moments(self, wavelength_nm: float) -> Moments:
        """The beam by its second moments; 1/e2 values of a Gaussian beam become 1/e ones."""
        flat = self.profile == "tophat"
        scale = 1e-3 if flat or self.level == "1/e" else 1e-3 / SQRT2
        (dx, dy), (px, py) = self.waist_diameters_mm(), self.divergence_mrad
        return Moments(flat, dx * scale, dy * scale, px * scale, py * scale, self.waist_m)

    @model_validator(mode="after")
    def _waist_is_possible(self) -> Beam:
        if min(self.waist_diameters_mm()) < LEAST_MM:
            raise ValueError(
                "the beam is narrower at the exit than the divergence and the way to the waist make it there"
            )
        return self


class FibreSingleMode(Strict):
    """The connectorised end of a single-mode fibre: a Gaussian of the mode field diameter.

    Full 1/e2 divergence 4 lambda / (pi MFD).
    """

    profile: Literal["fibre_single_mode"]
    mode_field_diameter_um: float = Field(ge=0.1, le=1000)

    def moments(self, wavelength_nm: float) -> Moments:
        """The beam by its second moments."""
        across = self.mode_field_diameter_um * 1e-6
        angle = 4.0 * wavelength_nm * 1e-9 / (math.pi * across)
        return Moments(False, across / SQRT2, across / SQRT2, angle / SQRT2, angle / SQRT2, 0.0)


class FibreMultimode(Strict):
    """The connectorised end of a multimode fibre: 1/e half angle = numerical aperture / 1.7."""

    profile: Literal["fibre_multimode"]
    numerical_aperture: float = Field(ge=0.01, le=1, description="At the 5 % points.")
    core_diameter_um: float = Field(ge=1, le=1e5)

    def moments(self, wavelength_nm: float) -> Moments:
        """The beam by its second moments; the core counts as the 1/e diameter."""
        across = self.core_diameter_um * 1e-6
        angle = 2.0 * self.numerical_aperture / NA_OVER_HALF_ANGLE
        return Moments(False, across, across, angle, angle, 0.0)


#: Models by the kind of beam.
KINDS = {"free": "Beam", "fibre_single_mode": "FibreSingleMode", "fibre_multimode": "FibreMultimode"}


def _tag(value: Any) -> str:
    """Which kind of beam: a fibre end by its name, anything else by waist and divergence."""
    profile = value.get("profile") if isinstance(value, dict) else getattr(value, "profile", None)
    return profile if profile in KINDS else "free"


AnyBeam = Annotated[
    Annotated[Beam, Tag("free")]
    | Annotated[FibreSingleMode, Tag("fibre_single_mode")]
    | Annotated[FibreMultimode, Tag("fibre_multimode")],
    Discriminator(_tag),
]
