"""Exposure, limit and ratio at any distances, for charts and tables."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.assess.evaluate import Evaluation
from service.assess.viewing import over_distances
from service.contract.answer import aid_of, evaluated, rule_set
from service.contract.convert import behind_bench, lines_of
from service.contract.request import EvaluationRequest

__all__ = ["TargetAlong", "along"]

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


def along(request: EvaluationRequest, distance_m: Floats) -> dict[str, TargetAlong]:
    """One laser at many distances [m]: `eye`, `skin` and, with an optical aid, `eye_aided`.

    Raises InvalidRequest where the rule set is unknown.
    """
    rules = rule_set(request.rules)
    with np.errstate(over="ignore", under="ignore"):
        lines = behind_bench([request], lines_of([request], rules)[0])
        plain = evaluated(request, lines, rules)
        found = {name: _target(plain, name, distance_m) for name in ("eye", "skin")}
        if request.viewing.aid is not None:
            aided = evaluated(request, lines, rules, aid_of(request.viewing.aid))
            found["eye_aided"] = _target(aided, "eye", distance_m)
    return found


def _target(evaluation: Evaluation, target: str, distance_m: Floats) -> TargetAlong:
    limits, each, worst = over_distances(evaluation, target, distance_m)
    first = each.argmax(axis=1)[:, None]
    limit = np.take_along_axis(limits, first, axis=1)[:, 0]
    return TargetAlong(worst, limit, each.max(axis=1) * limit)
