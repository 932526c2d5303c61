"""The exposure at chosen distances."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from service.assess.evaluate import Evaluation, TargetResult

__all__ = ["over_distances", "ratios_at", "ratios_from", "seen_from", "sum_of_lines", "sums_of_lines"]

Floats = NDArray[np.float64]


def ratios_at(evaluation: Evaluation, result: TargetResult, place_m: Floats) -> Floats:
    """Ratio of exposure to limit of each criterion, every line at distances of its own.

    Parameters
    ----------
    place_m : (lines,) distance from the last element [m], or (places, lines)

    Returns
    -------
    (criteria,) ratios, or (places, criteria)
    """
    criteria = result.criteria
    there = place_m[..., criteria.line]
    places = there.shape[0] if there.ndim > 1 else 1
    beams = evaluation.lines.beams.take(np.tile(criteria.line, places))
    inside = beams.fraction(np.tile(criteria.aperture_m, places), there.ravel())
    return criteria.strength * inside.reshape(there.shape)


def ratios_from(evaluation: Evaluation, result: TargetResult, distance_m: Floats) -> Floats:
    """Ratio of exposure to limit of each criterion at its worst place from a distance of its line on.

    Parameters
    ----------
    distance_m : (lines,) distance from the last element [m]

    Returns
    -------
    (criteria,) ratios
    """
    criteria = result.criteria
    beams = evaluation.lines.beams.take(criteria.line)
    return criteria.strength * beams.most_inside(criteria.aperture_m, distance_m[criteria.line])


def sums_of_lines(evaluation: Evaluation, result: TargetResult, ratios: Floats) -> Floats:
    """Worst sum per tissue of one laser: each line with its worst criterion, the lines added.

    Parameters
    ----------
    ratios : (places, criteria) ratios of exposure to limit

    Returns
    -------
    (places,) sums
    """
    kind = evaluation.rules.additivity[result.criteria.row]
    worst = np.zeros(len(ratios))
    for name in np.unique(kind):
        total = np.zeros(len(ratios))
        for line in np.unique(result.criteria.line[kind == name]):
            own = (kind == name) & (result.criteria.line == line)
            total += ratios[:, own].max(axis=1)
        worst = np.maximum(worst, total)
    return worst


def over_distances(evaluation: Evaluation, target: str, distance_m: Floats) -> tuple[Floats, Floats, Floats]:
    """Limits and ratios of one laser over distances, with the limits that hold there.

    Parameters
    ----------
    distance_m : (places,) distances from the last element [m]

    Returns
    -------
    limit of each criterion per pulse or over the whole exposure [J/m2] and its ratio, both
    (places, criteria); the worst ratio with lines added, (places,)
    """
    if evaluation.moving is not None:
        return evaluation.moving.over(evaluation, target, distance_m)
    result = evaluation.target(target)
    places = np.broadcast_to(distance_m[:, None], (len(distance_m), evaluation.lines.count))
    ratios = ratios_at(evaluation, result, places)
    limits = np.broadcast_to(result.criteria.limit_j_m2, ratios.shape)
    return limits, ratios, sums_of_lines(evaluation, result, ratios)


def seen_from(evaluation: Evaluation, distance_m: float) -> Evaluation:
    """The evaluation of one laser with the limits that hold at a distance [m]."""
    return evaluation if evaluation.moving is None else evaluation.moving.at(distance_m)


def sum_of_lines(evaluation: Evaluation, result: TargetResult, ratio: Floats) -> float:
    """`sums_of_lines` at one place, `ratio` being (criteria,)."""
    return float(sums_of_lines(evaluation, result, ratio[None, :])[0])
