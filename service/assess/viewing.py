"""The exposure at a chosen distance."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from service.assess.evaluate import Evaluation, TargetResult

__all__ = ["ratios_at"]

Floats = NDArray[np.float64]


def ratios_at(evaluation: Evaluation, result: TargetResult, distance_m: Floats) -> tuple[Floats, Floats]:
    """Ratio of exposure to limit of each criterion and, lines added, of each laser at a distance.

    Parameters
    ----------
    distance_m : (lasers,) distance from the last element [m]

    Returns
    -------
    (criteria,) ratios and (lasers,) worst ratios
    """
    criteria, lines = result.criteria, evaluation.lines
    laser = lines.laser[criteria.line]
    beams = lines.beams.take(criteria.line)
    each = criteria.strength * beams.fraction(criteria.aperture_m, distance_m[laser])
    kind = evaluation.rules.additivity[criteria.row]
    by_line: dict[tuple[int, int, int], float] = {}
    for group in zip(laser.tolist(), kind.tolist(), criteria.line.tolist(), each.tolist(), strict=True):
        key = group[:3]
        by_line[key] = max(by_line.get(key, 0.0), group[3])
    sums: dict[tuple[int, int], float] = {}
    for (number, name, _), ratio in by_line.items():
        sums[number, name] = sums.get((number, name), 0.0) + ratio
    worst = np.zeros(lines.lasers)
    for (number, _), total in sums.items():
        worst[number] = max(worst[number], total)
    return each, worst
