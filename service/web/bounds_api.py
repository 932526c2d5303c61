"""Bounds, tolerances, measured values, profiles and structured sources as JSON."""

from __future__ import annotations

from typing import Annotated, Any

from fastapi import APIRouter, Depends
from pydantic import BaseModel
from starlette.requests import Request
from starlette.responses import Response

from service.contract.bounds import BoundsRequest
from service.contract.bounds_answer import bounds
from service.contract.bounds_medium import media_documents
from service.contract.bounds_result import BoundsResult, GainMediumDocument
from service.contract.measured import MeasuredRequest, MeasuredResult
from service.contract.measured_answer import measured
from service.contract.partial_source import PartialSourceRequest, PartialSourceResult
from service.contract.partial_source_answer import partial_source
from service.contract.profile import ProfileRequest, ProfileResult
from service.contract.profile_answer import profile
from service.contract.tolerance import ToleranceRequest, ToleranceResult
from service.contract.tolerance_answer import tolerance
from service.web.body import read_model

__all__ = ["BODIES", "router"]

router = APIRouter(prefix="/api/v1", tags=["bounds and measurements"])

#: Request of every call with a body.
BODIES: dict[str, type[BaseModel]] = {
    "/api/v1/bounds": BoundsRequest,
    "/api/v1/tolerance": ToleranceRequest,
    "/api/v1/measured": MeasuredRequest,
    "/api/v1/profile": ProfileRequest,
    "/api/v1/partial-source": PartialSourceRequest,
}


def _json(model: Any) -> Response:
    return Response(model.model_dump_json(), media_type="application/json")


async def _bounds_body(request: Request) -> BoundsRequest:
    return await read_model(request, BoundsRequest)


async def _tolerance_body(request: Request) -> ToleranceRequest:
    return await read_model(request, ToleranceRequest)


async def _measured_body(request: Request) -> MeasuredRequest:
    return await read_model(request, MeasuredRequest)


async def _profile_body(request: Request) -> ProfileRequest:
    return await read_model(request, ProfileRequest, image=True)


async def _source_body(request: Request) -> PartialSourceRequest:
    return await read_model(request, PartialSourceRequest, image=True)


@router.get("/gain-media", summary="Gain media")
async def get_gain_media() -> list[GainMediumDocument]:
    """Every gain medium with its figures, their sources and how each is known."""
    return media_documents()


@router.post("/bounds", response_model=BoundsResult, summary="Bounds for an unmeasured laser")
def post_bounds(body: Annotated[BoundsRequest, Depends(_bounds_body)]) -> Response:
    """Upper bounds from pump, medium and resonator, and evaluations of them."""
    return _json(bounds(body))


@router.post("/tolerance", response_model=ToleranceResult, summary="An evaluation with tolerances")
def post_tolerance(body: Annotated[ToleranceRequest, Depends(_tolerance_body)]) -> Response:
    """Nominal, worst case and distribution of an evaluation whose figures carry tolerances."""
    return _json(tolerance(body))


@router.post("/measured", response_model=MeasuredResult, summary="Measured values as an evaluation")
def post_measured(body: Annotated[MeasuredRequest, Depends(_measured_body)]) -> Response:
    """Fit the beam, reckon the whole from a reading behind an aperture, and evaluate both."""
    return _json(measured(body))


@router.post("/profile", response_model=ProfileResult, summary="A camera image of the beam")
def post_profile(body: Annotated[ProfileRequest, Depends(_profile_body)]) -> Response:
    """Second moments, the worst share in each aperture, and the exposure in the plane of the image."""
    return _json(profile(body))


@router.post(
    "/partial-source", response_model=PartialSourceResult, summary="The worst part of a structured source"
)
def post_partial_source(body: Annotated[PartialSourceRequest, Depends(_source_body)]) -> Response:
    """The most restrictive part of an array of emitters or of an image of a source."""
    return _json(partial_source(body))
