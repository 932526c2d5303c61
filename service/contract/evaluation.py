"""The whole result of contract v1."""

from __future__ import annotations

from typing import Any

from pydantic import Field

from service.contract.airspace import Airspace
from service.contract.classification import HazardClass
from service.contract.measures import Measures
from service.contract.moving import DiffuseAnswer, ScanAnswer
from service.contract.over_distance import OverDistanceAnswer
from service.contract.protection import Protection
from service.contract.result import (
    Duration,
    Model,
    Notice,
    Provenance,
    RulesInfo,
    TargetAnswer,
    WorkingStep,
)

__all__ = ["Comparison", "EvaluationResult"]


class EvaluationResult(Model):
    """The answer to one request."""

    rules: RulesInfo
    eye: TargetAnswer
    skin: TargetAnswer
    eye_aided: TargetAnswer | None = Field(description="The eye behind viewing.aid; null without one.")
    diffuse: DiffuseAnswer | None = Field(description="The lit spot; null without a diffuser.")
    scan: ScanAnswer | None = Field(description="The sweep and the case that it stops; null without one.")
    airspace: Airspace | None = Field(description="Visual interference with aircraft; null unless asked for.")
    over_distance: OverDistanceAnswer | None
    inputs: dict[str, Any] = Field(description="The request with every default filled in.")
    durations: list[Duration]
    working: list[WorkingStep]
    classification: list[HazardClass] = Field(description="Under every scheme, the default first.")
    protection: Protection
    measures: Measures
    notices: list[Notice]
    cautions: list[str]
    provenance: Provenance


class Comparison(Model):
    """One request under every rule set, the default rule set first."""

    results: list[EvaluationResult]
