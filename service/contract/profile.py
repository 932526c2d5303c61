"""Beam profile files: the request and the answer."""

from __future__ import annotations

from typing import Any, Literal

from pydantic import Field

from service.contract.request import EvaluationRequest, Strict
from service.contract.result import Model, Notice

__all__ = ["ApertureFraction", "PlaneCriterion", "PlaneTarget", "ProfileRequest", "ProfileResult"]

MAX_TEXT = 64_000_000


class ProfileRequest(Strict):
    """An image of the beam, its pixel size, and the evaluation in whose plane it was taken."""

    image: str = Field(max_length=MAX_TEXT, description="PNG or TIFF as base64, or the text of a CSV table.")
    format: Literal["png", "tiff", "csv"] = "png"
    pixel_um: float = Field(
        gt=0, le=1e6, description="Size of a pixel across in micrometres, in the beam's plane."
    )
    pixel_y_um: float | None = Field(None, gt=0, le=1e6, description="Its height where it is no square.")
    background: float | None = Field(
        None, ge=-1e9, le=1e9, description="Signal without a beam; left out: from the corners."
    )
    distance_m: float = Field(
        0.0, ge=0, le=1e6, description="Distance of the plane from the exit or last element in metres."
    )
    apertures_mm: list[float] = Field(
        default_factory=lambda: [1.0, 3.5, 7.0],
        max_length=12,
        description="Apertures to judge in millimetres, besides those of the evaluation.",
    )
    evaluation: EvaluationRequest | None = Field(None, description="The laser whose beam this is.")
    line: int = Field(0, ge=0, le=15, description="Its emission line that was imaged, from 0.")


class ApertureFraction(Model):
    """The beam inside an aperture."""

    aperture_mm: float
    fraction: float = Field(description="Largest fraction with the aperture anywhere.")
    at_mm: tuple[float, float] = Field(description="Its centre then, from the middle of the first pixel.")
    gaussian_fraction: float = Field(description="Of a Gaussian beam of the same second moments, centred.")
    ratio: float = Field(description="fraction / gaussian_fraction: above 1 the Gaussian is too kind.")


class PlaneCriterion(Model):
    """One criterion of the imaged line in the plane of the image."""

    rule: str
    tissue: str
    effect: str
    row: str
    aperture_mm: float
    fraction: float
    hazard_ratio: float = Field(description="Exposure over limit with the image's profile.")
    entered_ratio: float = Field(description="The same with the beam as it was entered.")


class PlaneTarget(Model):
    """Eye or skin in the plane of the image, for the imaged line."""

    hazard_ratio: float
    optical_density: float
    entered_ratio: float
    exceeded: bool
    criteria: list[PlaneCriterion]


class ProfileResult(Model):
    """The beam by its second moments, its share in apertures, and the exposure in its plane."""

    columns: int
    rows: int
    background: float
    centre_mm: tuple[float, float]
    diameter_mm: tuple[float, float] = Field(description="Second-moment diameters along x and y.")
    principal_mm: tuple[float, float] = Field(description="Second-moment diameters, major and minor axis.")
    azimuth_deg: float = Field(description="From x to the major axis, towards y (downwards).")
    fractions: list[ApertureFraction]
    eye: PlaneTarget | None
    skin: PlaneTarget | None
    inputs: dict[str, Any] = Field(description="The request without its image.")
    image_digest: str
    notices: list[Notice]
    cautions: list[str]
    service_version: str
