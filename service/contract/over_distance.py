"""Exposure, limit and ratio over distance, for every criterion."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from service.assess.evaluate import Evaluation
from service.assess.viewing import over_distances
from service.contract.request import EvaluationRequest
from service.contract.result import Model

__all__ = ["CriterionOverDistance", "OverDistanceAnswer", "over_distance_of"]


class CriterionOverDistance(Model):
    """One criterion, by its number in the answer's list. The limits are those that hold at the places."""

    criterion: int
    limit_j_m2: list[float]
    exposure_j_m2: list[float]
    hazard_ratio: list[float]


class TargetOverDistance(Model):
    """Every criterion of a target, and the worst ratio with lines added."""

    criteria: list[CriterionOverDistance]
    hazard_ratio: list[float]


class OverDistanceAnswer(Model):
    """Places [m] and what happens there."""

    distance_m: list[float]
    eye: TargetOverDistance
    skin: TargetOverDistance


def over_distance_of(request: EvaluationRequest, evaluation: Evaluation) -> OverDistanceAnswer | None:
    """The answer over the distances asked for; None where none were."""
    asked = request.viewing.over_distance
    if asked is None:
        return None
    places = np.geomspace(asked.from_m, asked.to_m, asked.points)
    places[0], places[-1] = asked.from_m, asked.to_m
    return OverDistanceAnswer(
        distance_m=places.tolist(),
        eye=_target(evaluation, "eye", places),
        skin=_target(evaluation, "skin", places),
    )


def _target(evaluation: Evaluation, target: str, places: NDArray[np.float64]) -> TargetOverDistance:
    limits, ratios, worst = over_distances(evaluation, target, places)
    return TargetOverDistance(
        criteria=[
            CriterionOverDistance(
                criterion=k,
                limit_j_m2=limits[:, k].tolist(),
                exposure_j_m2=(ratios[:, k] * limits[:, k]).tolist(),
                hazard_ratio=ratios[:, k].tolist(),
            )
            for k in range(limits.shape[1])
        ],
        hazard_ratio=worst.tolist(),
    )
