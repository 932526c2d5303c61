"""Structured sources: the request and the answer."""

from __future__ import annotations

from typing import Any, Literal

from pydantic import Field, model_validator

from service.contract.profile import MAX_TEXT
from service.contract.request import EvaluationRequest, Strict
from service.contract.result import Model, Notice

__all__ = ["Emitter", "PartialSourceRequest", "PartialSourceResult", "SourcePart"]

MAX_EMITTERS = 2000
Length = Field(ge=-1e6, le=1e6, description="Place of its centre in millimetres.")


class Emitter(Strict):
    """One emitter of an array: a disc or a rectangle."""

    x_mm: float = Length
    y_mm: float = Length
    width_mm: float = Field(gt=0, le=1e5, description="Diameter, or width, in millimetres.")
    height_mm: float | None = Field(None, gt=0, le=1e5, description="Height where it differs.")
    shape: Literal["disc", "rectangle"] = "disc"
    power: float = Field(1.0, gt=0, le=1e12, description="Its power beside that of the others, in any unit.")


class PartialSourceRequest(Strict):
    """An evaluation of the whole source, and what the source looks like."""

    evaluation: EvaluationRequest = Field(description="The laser; its line's own subtense is not used.")
    line: int = Field(0, ge=0, le=15, description="Its emission line with this source, from 0.")
    distance_m: float = Field(
        0.1, ge=1e-3, le=1e6, description="Distance from which the emitters are seen, in metres."
    )
    emitters: list[Emitter] = Field(
        default_factory=list, max_length=MAX_EMITTERS, description="The emitters of an array."
    )
    image: str | None = Field(
        None,
        max_length=MAX_TEXT,
        description="Or an image: PNG or TIFF as base64, or the text of a CSV table.",
    )
    format: Literal["png", "tiff", "csv"] = "png"
    pixel_um: float | None = Field(
        None, gt=0, le=1e6, description="Size of a pixel of the image in micrometres, in the source."
    )
    background: float | None = Field(
        None, ge=-1e9, le=1e9, description="Signal without a source; left out: from the corners."
    )

    @model_validator(mode="after")
    def _one_kind(self) -> PartialSourceRequest:
        if bool(self.emitters) == (self.image is not None):
            raise ValueError("give emitters, or image, one of the two")
        if self.image is not None and self.pixel_um is None:
            raise ValueError("an image needs pixel_um")
        return self


class SourcePart(Model):
    """A part of the source and what it comes to."""

    alpha_mrad: float = Field(
        description="Angular subtense: mean of both sides between alpha_min and alpha_max."
    )
    width_mrad: float
    height_mrad: float
    at_mrad: tuple[float, float] = Field(description="Its middle, from the upper left corner of the source.")
    share: float = Field(description="Share of the power that leaves it.")
    hazard_ratio: float = Field(description="Exposure over limit of the retina for this part alone.")


class PartialSourceResult(Model):
    """The most restrictive part of a source."""

    worst: SourcePart
    whole: SourcePart = Field(description="The whole source as if it shone evenly.")
    point_ratio: float = Field(description="The retina's ratio if all came from one point: the strictest.")
    parts: list[SourcePart] = Field(description="Parts that hold more than any smaller one.")
    eye_hazard_ratio: float = Field(description="Worst of the retina's parts and of the eye's other tissues.")
    eye_optical_density: float
    eye_hazard_distance_m: float | None = Field(description="Of the worst part, or of the other tissues.")
    governing: Literal["part", "other tissue"]
    evaluation: dict[str, Any] = Field(description="The worst part as an evaluation; for the retina only.")
    size_mrad: tuple[float, float]
    pixel_mrad: tuple[float, float]
    inputs: dict[str, Any] = Field(description="The request without an image.")
    notices: list[Notice]
    cautions: list[str]
    service_version: str
