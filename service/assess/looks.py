"""Eyewear for all who look: the bare eye, and the eye behind an optical aid."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from service.assess.aid import Aid
from service.assess.evaluate import Evaluation
from service.assess.protection import LineNeed, Pair, PairVerdict, judge, line_needs
from service.assess.viewing import ratios_at, ratios_from, seen_from
from service.rules.eyewear import EyewearTables

__all__ = ["Look", "both", "worse"]

Floats = NDArray[np.float64]

AID_WARNING = (
    "Judged behind the optical aid, which asks for more than the bare eye: it collects more and narrows the "
    "beam."
)


@dataclass(frozen=True, slots=True)
class Look:
    """One way of looking into a laser, bare or through an aid.

    Ratios of the eye's criteria and needs of the lines: at the most hazardous place and, where asked for, at
    the viewing distance, with the evaluation whose limits hold there.
    """

    evaluation: Evaluation
    ratio: Floats
    worst: list[LineNeed]
    seen: Evaluation
    ratio_there: Floats | None
    there: list[LineNeed] | None

    @classmethod
    def of(
        cls, evaluation: Evaluation, distance_m: float | None, tables: EyewearTables, aid: Aid | None = None
    ) -> Look:
        """The look at one laser, behind the aid with which it was evaluated."""
        as_given = evaluation
        if aid is not None:
            evaluation = _behind_aid(evaluation, aid)
        narrowest = evaluation.lines.beams.narrowest_m()
        ratio = ratios_from(evaluation, evaluation.eye, evaluation.lines.beams.nearest_m)
        worst = line_needs(evaluation, ratio, narrowest, tables, onward=True)
        if distance_m is None:
            return cls(evaluation, ratio, worst, evaluation, None, None)
        places = np.full(narrowest.shape, distance_m)
        seen = evaluation
        if as_given.moving is not None:
            # The spot as it looks from there is made anew, without what the aid adds to its load.
            seen = seen_from(as_given, distance_m)
            seen = seen if aid is None else _behind_aid(seen, aid)
        ratio_there = ratios_at(seen, seen.eye, places)
        there = line_needs(seen, ratio_there, places, tables, onward=False)
        return cls(evaluation, ratio, worst, seen, ratio_there, there)

    def judge(self, pair: Pair) -> PairVerdict:
        """The pair at the most hazardous place."""
        return judge(pair, self.evaluation, self.ratio, self.worst)

    def enough_there(self, pair: Pair) -> bool | None:
        """Whether the pair will do at the viewing distance."""
        if self.ratio_there is None or self.there is None:
            return None
        return judge(pair, self.seen, self.ratio_there, self.there).sufficient


def _behind_aid(evaluation: Evaluation, aid: Aid) -> Evaluation:
    """An evaluation behind an aid with lines that load eyewear behind it.

    The aid narrows the beam M times, so that M^2 is the most by which the irradiance grows.
    """
    lines = evaluation.lines
    gain = np.where(aid.passes(lines.wavelength_nm), aid.magnification**2 * aid.transmittance, 1.0)
    return replace(evaluation, lines=replace(lines, emitted=lines.emitted * np.maximum(gain, 1.0)))


def worse(bare: PairVerdict, behind: PairVerdict | None) -> PairVerdict:
    """Of two verdicts on a pair the one that counts; behind an aid it says so."""
    if behind is None:
        return bare

    def badness(v: PairVerdict) -> tuple[bool, bool, float]:
        return not v.sufficient, not v.dense_enough, v.remaining_ratio

    if badness(behind) <= badness(bare):
        return bare
    return replace(behind, warnings=[*behind.warnings, AID_WARNING])


def both(bare: bool | None, behind: bool | None) -> bool | None:
    """Whether a pair will do for all that look."""
    return bare if behind is None else bool(bare and behind)
