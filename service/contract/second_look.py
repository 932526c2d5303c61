"""A second look: what becomes of the result where an assumption behind it does not hold.

The 0.25 s of visible light rest on the aversion response of the eye, which does not protect skin. The angular
subtense of a source is taken as constant, though a real source looks smaller from farther away. Haze clears.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from service.assess.evaluate import Evaluation, evaluate_target
from service.assess.steps import number_up
from service.contract.result import Notice

__all__ = ["LONGER_SKIN", "SecondLook", "second_look"]

LONGER_SKIN, EXTENDED, HAZY = "skin-longer-exposure", "extended-source", "hazy-air"
#: Seconds for which bare skin may stay in a visible beam (common practice, no source).
SKIN_S = 10.0
#: Exposures of visible light up to this duration are taken to end by a blink (IEC 60825-1, Class 2).
BLINK_S, VISIBLE_NM = 0.25, (400.0, 700.0)


@dataclass(slots=True)
class SecondLook:
    """A batch evaluated again under the stricter assumptions.

    Per laser, NaN where an assumption does not matter: `skin_ratio` and `skin_far_m` [m] for a longer
    exposure of skin, `point_far_m` [m] of the eye for a point source, `clear_far_m` [m] of the eye in clear
    air.
    """

    evaluation: Evaluation
    skin_ratio: NDArray[np.float64]
    skin_far_m: NDArray[np.float64]
    point_far_m: NDArray[np.float64]
    clear_far_m: NDArray[np.float64]

    def longer(self) -> NDArray[np.bool_]:
        """Lasers whose skin is worse off when the exposure lasts longer."""
        result: NDArray[np.bool_] = (self.skin_ratio > 1.0) & (
            self.skin_ratio > self.evaluation.skin.worst_ratio
        )
        return result

    def nearer(self) -> NDArray[np.bool_]:
        """Lasers that reach farther as a point source."""
        result: NDArray[np.bool_] = self.point_far_m > self.evaluation.eye.far_m
        return result

    def hazier(self) -> NDArray[np.bool_]:
        """Lasers that reach farther in clear air."""
        result: NDArray[np.bool_] = self.clear_far_m > self.evaluation.eye.far_m
        return result

    def codes(self) -> list[list[str]]:
        """The codes of the notices for each laser, in the order of `notices`."""
        each = zip(self.longer().tolist(), self.hazier().tolist(), self.nearer().tolist(), strict=True)
        return [[LONGER_SKIN] * skin + [HAZY] * haze + [EXTENDED] * near for skin, haze, near in each]

    def notices(self, laser: int) -> Iterator[Notice]:
        """Notices for one laser."""
        lines = self.evaluation.lines
        members = np.flatnonzero(lines.laser == laser)
        if self.longer()[laser]:
            yield Notice(
                code=LONGER_SKIN,
                field="exposure_s",
                text=f"{float(lines.exposure_s[members].min()):g} s of visible light rest on a blink, which "
                f"does not protect skin. Held in the beam for {SKIN_S:g} s, bare skin gets up to "
                f"{number_up(self.skin_ratio[laser])} times its limit, and more than its limit "
                f"{_reach(float(self.skin_far_m[laser]))}.",
            )
        if self.hazier()[laser]:
            yield Notice(
                code=HAZY,
                field="viewing.visibility_km",
                text="The distances hold in haze only. In clear air the limit of the eye is exceeded "
                f"{_reach(float(self.clear_far_m[laser]))}, not just "
                f"{_reach(float(self.evaluation.eye.far_m[laser]))}. The visibility counts at a contrast of "
                "2 %: a meteorological optical range (5 %) is to be multiplied by 1.3 first.",
            )
        if self.nearer()[laser]:
            wide = int(np.flatnonzero(self.evaluation.conditions.extended[members])[0])
            yield Notice(
                code=EXTENDED,
                field=f"lines.{wide}.subtense_mrad",
                text="The angle of the source is taken as the same at every distance; a real source looks "
                "smaller from farther away, and a narrow beam looks like a point. As a point source this "
                f"laser exceeds the limit of the eye {_reach(float(self.point_far_m[laser]))}, not just "
                f"{_reach(float(self.evaluation.eye.far_m[laser]))}. Use the shorter distance only if the "
                "angle holds there.",
            )


def second_look(evaluation: Evaluation) -> SecondLook:
    """Evaluate again, under the stricter assumption, the lasers of a batch for which it matters."""
    lines, rules = evaluation.lines, evaluation.rules
    found = SecondLook(evaluation, *(np.full(lines.lasers, np.nan) for _ in range(4)))
    visible = (lines.wavelength_nm >= VISIBLE_NM[0]) & (lines.wavelength_nm <= VISIBLE_NM[1])
    which = np.unique(lines.laser[visible & (lines.exposure_s <= BLINK_S)])
    if which.size:
        chosen = lines.of_lasers(which)
        longer = replace(chosen, exposure_s=np.maximum(chosen.exposure_s, SKIN_S))
        skin = evaluate_target("skin", longer, rules)
        found.skin_ratio[which], found.skin_far_m[which] = skin.worst_ratio, skin.far_m
    which = np.unique(lines.laser[evaluation.conditions.extended > 0])
    if which.size:
        chosen = lines.of_lasers(which)
        point = replace(chosen, subtense_mrad=np.zeros(chosen.subtense_mrad.shape))
        found.point_far_m[which] = evaluate_target("eye", point, rules).far_m
    which = np.unique(lines.laser[lines.beams.extinction_per_m > 0.0])
    if which.size:
        chosen = lines.of_lasers(which)
        clear = replace(chosen, beams=replace(chosen.beams, extinction_per_m=np.zeros(chosen.count)))
        found.clear_far_m[which] = evaluate_target("eye", clear, rules).far_m
    return found


def _reach(far_m: float) -> str:
    """Where a limit is exceeded, in words."""
    if np.isinf(far_m):
        return "at every distance"
    return f"out to {number_up(far_m, 4)} m" if far_m > 0.0 else "nowhere"
