"""The exposure along the beam: one laser at many distances at once."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from service.assess.evaluate import Evaluation, TargetResult

__all__ = ["ratios_along"]

Floats = NDArray[np.float64]


def ratios_along(evaluation: Evaluation, result: TargetResult, place_m: Floats) -> tuple[Floats, Floats]:
    """Ratio of exposure to limit of each criterion at each distance, and the worst with lines added.

    The same as the ratio at one distance: strength x fraction inside the aperture; within a tissue each
    line enters with its worst criterion and the lines add.

    Parameters
    ----------
    evaluation : of one laser
    result : of one of its targets
    place_m : (n,) distances from the last element [m]

    Returns
    -------
    (criteria, n) ratios and (n,) worst ratios
    """
    criteria, lines = result.criteria, evaluation.lines
    count, places = len(criteria.line), len(place_m)
    beams = lines.beams.take(np.repeat(criteria.line, places))
    fraction = beams.fraction(np.repeat(criteria.aperture_m, places), np.tile(place_m, count))
    each = criteria.strength[:, None] * fraction.reshape(count, places)
    kind = evaluation.rules.additivity[criteria.row]
    order = np.lexsort((criteria.line, kind))
    kind, line = kind[order], criteria.line[order]
    new_kind = np.r_[True, kind[1:] != kind[:-1]]
    heads = np.flatnonzero(new_kind | np.r_[True, line[1:] != line[:-1]])
    by_line = np.maximum.reduceat(each[order], heads, axis=0)
    sums = np.add.reduceat(by_line, np.flatnonzero(new_kind[heads]), axis=0)
    return each, sums.max(axis=0)
