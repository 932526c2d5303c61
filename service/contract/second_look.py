"""A second look: what becomes of the result where an assumption behind it does not hold.

The 0.25 s of visible light rest on the aversion response of the eye, which does not protect skin. The angular
subtense of a source is taken as constant, though a real source looks smaller from farther away. Haze clears.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from service.assess.evaluate import Evaluation, evaluate
from service.assess.steps import number_up
from service.contract.result import Notice

__all__ = ["LONGER_SKIN", "second_looks"]

LONGER_SKIN = "skin-longer-exposure"
#: Seconds for which bare skin may stay in a visible beam (common practice, no source).
SKIN_S = 10.0
#: Exposures of visible light up to this duration are taken to end by a blink (IEC 60825-1, Class 2).
BLINK_S, VISIBLE_NM = 0.25, (400.0, 700.0)


def second_looks(evaluation: Evaluation) -> Iterator[Notice]:
    """Notices for one laser, from evaluating it again under the stricter assumption."""
    lines, rules = evaluation.lines, evaluation.rules
    visible = (lines.wavelength_nm >= VISIBLE_NM[0]) & (lines.wavelength_nm <= VISIBLE_NM[1])
    if (visible & (lines.exposure_s <= BLINK_S)).any():
        longer = replace(lines, exposure_s=np.maximum(lines.exposure_s, SKIN_S))
        skin = evaluate(longer, rules).skin
        if skin.worst_ratio[0] > 1.0 and skin.worst_ratio[0] > evaluation.skin.worst_ratio[0]:
            yield Notice(
                code=LONGER_SKIN,
                field="exposure_s",
                text=f"{float(lines.exposure_s.min()):g} s of visible light rest on a blink, which does not "
                f"protect skin. Held in the beam for {SKIN_S:g} s, bare skin gets up to "
                f"{number_up(skin.worst_ratio[0])} times its limit, and more than its limit "
                f"{_reach(float(skin.far_m[0]))}.",
            )
    if lines.beams.extinction_per_m.any():
        clear = replace(lines, beams=replace(lines.beams, extinction_per_m=np.zeros(lines.count)))
        far = float(evaluate(clear, rules).eye.far_m[0])
        if far > evaluation.eye.far_m[0]:
            yield Notice(
                code="hazy-air",
                field="viewing.visibility_km",
                text="The distances hold in haze only. In clear air the limit of the eye is exceeded "
                f"{_reach(far)}, not just {_reach(float(evaluation.eye.far_m[0]))}. The visibility counts at "
                "a contrast of 2 %: a meteorological optical range (5 %) is to be multiplied by 1.3 first.",
            )
    wide = np.flatnonzero(evaluation.conditions.extended)
    if wide.size:
        point = replace(lines, subtense_mrad=np.zeros(lines.subtense_mrad.shape))
        eye = evaluate(point, rules).eye
        if eye.far_m[0] > evaluation.eye.far_m[0]:
            yield Notice(
                code="extended-source",
                field=f"lines.{int(wide[0])}.subtense_mrad",
                text="The angle of the source is taken as the same at every distance; a real source looks "
                "smaller from farther away, and a narrow beam looks like a point. As a point source this "
                f"laser exceeds the limit of the eye {_reach(float(eye.far_m[0]))}, not just "
                f"{_reach(float(evaluation.eye.far_m[0]))}. Use the shorter distance only if the angle holds "
                "there.",
            )


def _reach(far_m: float) -> str:
    """Where a limit is exceeded, in words."""
    if np.isinf(far_m):
        return "at every distance"
    return f"out to {number_up(far_m, 4)} m" if far_m > 0.0 else "nowhere"
