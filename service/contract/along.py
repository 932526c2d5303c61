"""Exposure, limit and ratio at any distances, for charts and tables."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.assess.along import ratios_along
from service.assess.evaluate import Evaluation, TargetResult, evaluate
from service.contract.answer import rule_set
from service.contract.convert import lines_of
from service.contract.request import EvaluationRequest

__all__ = ["Along", "TargetAlong", "along"]

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class TargetAlong:
    """One target at every distance.

    `hazard_ratio`: worst exposure / limit with lines added. `limit_j_m2` and `exposure_j_m2`: of the
    criterion with the largest ratio of its own there, counted as the answer counts them.
    """

    hazard_ratio: Floats
    limit_j_m2: Floats
    exposure_j_m2: Floats


@dataclass(frozen=True, slots=True)
class Along:
    """What happens at each distance [m] from the last element."""

    distance_m: Floats
    eye: TargetAlong
    skin: TargetAlong


def along(request: EvaluationRequest, distance_m: Floats) -> Along:
    """One laser at many distances [m]. Raises InvalidRequest where its rule set is unknown."""
    rules = rule_set(request.rules)
    lines, _ = lines_of([request], rules)
    with np.errstate(over="ignore", under="ignore"):
        evaluation = evaluate(lines, rules)
        eye = _target(evaluation, evaluation.eye, distance_m)
        skin = _target(evaluation, evaluation.skin, distance_m)
    return Along(distance_m, eye, skin)


def _target(evaluation: Evaluation, result: TargetResult, distance_m: Floats) -> TargetAlong:
    each, worst = ratios_along(evaluation, result, distance_m)
    first = each.argmax(axis=0)
    limit = result.criteria.limit_j_m2[first]
    return TargetAlong(worst, limit, each.max(axis=0) * limit)
