"""Lit spots and sweeping beams: what the answer tells of them beside the targets."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np
from pydantic import Field

from service.assess.evaluate import Evaluation
from service.assess.lines import CW
from service.assess.look import look
from service.assess.moving import NEAREST_M
from service.assess.steps import number_up
from service.contract.result import Model, Notice, TargetAnswer
from service.rules.compiled import CompiledRules

__all__ = [
    "DAY_S",
    "DiffuseAnswer",
    "ScanAnswer",
    "SpotLine",
    "SweptLine",
    "diffuse_answer",
    "moving_notices",
    "standing_still",
    "swept_lines",
]

#: A working day of looking at a spot [s].
DAY_S = 3e4


class SpotLine(Model):
    """The lit spot of one line and the angle under which it is seen."""

    line: int
    spot_mm: tuple[float, float] = Field(description="Widths: 1/e (d63), of a top hat the full width.")
    subtense_mrad: float = Field(description="Seen from the most hazardous place.")
    subtense_at_hazard_distance_mrad: float | None


class DiffuseAnswer(Model):
    """A lit spot on a diffuser: how large it looks, and whether one may look at it all day."""

    viewing_deg: float
    nearest_m: float = Field(description="Nobody looks from nearer than this.")
    lines: list[SpotLine]
    day_s: float = Field(description="Length of a working day.")
    day_hazard_ratio: float = Field(description="The eye, all day, at the most hazardous place.")
    day_hazard_distance_m: float | None
    safe_all_day: bool


class SweptLine(Model):
    """How one line passes an eye at the hazard distance (at the scanner itself where nothing is exceeded)."""

    line: int
    distance_m: float
    pass_s: float | None = Field(description="Duration of one pass; null for a pulsed line, not credited.")
    passes_hz: float | None


class ScanAnswer(Model):
    """A sweeping beam. The answer's eye and skin hold while it sweeps; these hold when it stops."""

    lines: list[SweptLine]
    failure_eye: TargetAnswer
    failure_skin: TargetAnswer


def _finite(x: float) -> float | None:
    return float(x) if np.isfinite(x) else None


def standing_still(evaluation: Evaluation) -> Evaluation:
    """What eyewear and windows must hold: a sweeping beam when it stops; else the evaluation itself."""
    moving = evaluation.moving
    return evaluation if moving is None or moving.setup.scan is None else moving.still


def diffuse_answer(evaluation: Evaluation, rules: CompiledRules) -> DiffuseAnswer | None:
    """The lit spots of one laser; None where there are none."""
    moving = evaluation.moving
    if moving is None or moving.setup.spots is None:
        return None
    spots, lines = moving.setup.spots, moving.setup.lines
    far = float(evaluation.eye.far_m[0])
    there = moving.at(far).lines.subtense_mrad if 0.0 < far < np.inf else None
    day = replace(moving.setup, lines=replace(lines, exposure_s=np.full(lines.count, DAY_S)))
    eye = look(day, rules).eye
    return DiffuseAnswer(
        viewing_deg=float(np.degrees(spots.viewing_rad)),
        nearest_m=NEAREST_M,
        lines=[
            SpotLine(
                line=k,
                spot_mm=(float(spots.x_m[k]) * 1e3, float(spots.y_m[k]) * 1e3),
                subtense_mrad=float(evaluation.lines.subtense_mrad[k]),
                subtense_at_hazard_distance_mrad=None if there is None else float(there[k]),
            )
            for k in range(lines.count)
        ],
        day_s=DAY_S,
        day_hazard_ratio=float(eye.worst_ratio[0]),
        day_hazard_distance_m=_finite(eye.far_m[0]),
        safe_all_day=bool(eye.worst_ratio[0] <= 1.0),
    )


def swept_lines(evaluation: Evaluation) -> list[SweptLine]:
    """How the lines of a sweeping laser pass an eye at the hazard distance."""
    assert evaluation.moving is not None
    far = float(evaluation.eye.far_m[0])
    far = far if np.isfinite(far) else float(evaluation.eye.place_m[0])
    there = evaluation.moving.at(far).lines
    swept = evaluation.moving.setup.lines.mode == CW
    return [
        SweptLine(
            line=k,
            distance_m=far,
            pass_s=float(there.pulse_s[k]) if swept[k] else None,
            passes_hz=float(there.rate_hz[k]) if swept[k] else None,
        )
        for k in range(there.count)
    ]


def moving_notices(evaluation: Evaluation) -> Iterator[Notice]:
    """What a reader must know of a spot or a sweep."""
    moving = evaluation.moving
    if moving is None:
        return
    if moving.setup.scan is not None:
        far = float(moving.still.eye.far_m[0])
        reach = "at every distance" if np.isinf(far) else f"out to {number_up(far, 4)} m"
        stopped = f"the eye is at risk {reach}" if far > 0.0 else "the eye is not at risk"
        yield Notice(
            code="scanner-may-stop",
            field="bench",
            text="The distances hold while the beam sweeps. When the scanner stops, "
            f"{stopped}. Only a tested device that cuts the beam off when the sweep fails justifies the "
            "shorter distance. Eyewear, windows and class are judged for the beam standing still.",
        )
        if (moving.setup.lines.mode != CW).any():
            yield Notice(
                code="sweep-not-credited",
                field="bench",
                text="Pulsed lines are judged as if the beam stood still, which is stricter.",
            )
    if moving.setup.spots is not None:
        yield Notice(
            code="lit-spot",
            field="bench",
            text=f"Only the light scattered by the spot is evaluated, from {NEAREST_M:g} m on. The beam in "
            "front of the spot and any shine from its surface need evaluations of their own.",
        )
