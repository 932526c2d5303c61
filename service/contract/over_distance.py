"""Exposure, limit and ratio over distance, for every criterion."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from service.assess.evaluate import Evaluation, TargetResult
from service.assess.viewing import ratios_at, sums_of_lines
from service.contract.request import EvaluationRequest
from service.contract.result import Model

__all__ = ["CriterionOverDistance", "OverDistanceAnswer", "over_distance_of"]

Floats = NDArray[np.float64]


class CriterionOverDistance(Model):
    """One criterion, by its number in the answer's list."""

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
        eye=_target(evaluation, evaluation.eye, places),
        skin=_target(evaluation, evaluation.skin, places),
    )


def _target(evaluation: Evaluation, result: TargetResult, places: Floats) -> TargetOverDistance:
    lines = np.broadcast_to(places[:, None], (len(places), evaluation.lines.count))
    ratios = ratios_at(evaluation, result, lines)
    limit = result.criteria.limit_j_m2
    return TargetOverDistance(
        criteria=[
            CriterionOverDistance(
                criterion=k,
                limit_j_m2=[float(limit[k])] * len(places),
                exposure_j_m2=(ratios[:, k] * limit[k]).tolist(),
                hazard_ratio=ratios[:, k].tolist(),
            )
            for k in range(len(limit))
        ],
        hazard_ratio=sums_of_lines(evaluation, result, ratios).tolist(),
    )
