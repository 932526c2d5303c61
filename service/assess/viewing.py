"""The exposure at chosen distances."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from service.assess.evaluate import Evaluation, TargetResult

__all__ = ["ratios_at", "sum_of_lines", "worst_sum"]

Floats = NDArray[np.float64]


def ratios_at(evaluation: Evaluation, result: TargetResult, place_m: Floats) -> Floats:
    """Ratio of exposure to limit of each criterion, every line at a distance of its own.

    Parameters
    ----------
    place_m : (lines,) distance from the last element [m]

    Returns
    -------
    (criteria,) ratios
    """
    criteria = result.criteria
    beams = evaluation.lines.beams.take(criteria.line)
    return criteria.strength * beams.fraction(criteria.aperture_m, place_m[criteria.line])


def sum_of_lines(evaluation: Evaluation, result: TargetResult, ratio: Floats) -> float:
    """Worst sum per tissue of one laser: each line with its worst criterion, the lines added.

    Parameters
    ----------
    ratio : (criteria,) ratios of exposure to limit
    """
    kind = evaluation.rules.additivity[result.criteria.row]
    return worst_sum(kind.tolist(), result.criteria.line.tolist(), ratio.tolist())


def worst_sum(kind: list[int], line: list[int], ratio: list[float]) -> float:
    """Worst sum of the criteria of one laser, given the additivity class, line and ratio of each."""
    worst: dict[tuple[int, int], float] = {}
    for name, number, value in zip(kind, line, ratio, strict=True):
        worst[name, number] = max(worst.get((name, number), 0.0), value)
    sums: dict[int, float] = {}
    for (name, _), value in worst.items():
        sums[name] = sums.get(name, 0.0) + value
    return max(sums.values())
