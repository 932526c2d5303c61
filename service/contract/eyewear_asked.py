"""What eyewear must offer against all of an evaluation: lines that add, optical aids, sweeps that stop."""

from __future__ import annotations

import math

from service.contract.evaluation import EvaluationResult
from service.contract.protection import AtPlace

__all__ = ["density_asked", "lines_together", "places"]


def places(result: EvaluationResult, k: int) -> dict[str, AtPlace]:
    """What line k needs by name in the answer: for the bare eye and, where one was entered, behind an aid."""
    need = result.protection.lines[k]
    found = {"worst_place": need.worst_place}
    return found if need.behind_aid is None else {**found, "behind_aid": need.behind_aid}


def lines_together(result: EvaluationResult, k: int) -> int:
    """The most lines that add with line k to more than the limit; 1 where none do."""
    targets = [result.eye, result.eye_aided]
    if result.scan is not None:
        targets += [result.scan.failure_eye, result.scan.failure_eye_aided]
    sums = [s for t in targets if t is not None for s in t.sums if k in s.lines and s.hazard_ratio > 1.0]
    return max((len(s.lines) for s in sums), default=1)


def density_asked(result: EvaluationResult, k: int) -> tuple[str, float]:
    """Place, by its name in the answer, and optical density where line k needs the most.

    Where n lines add each counts n times (log10 n more density), so that behind filters of these densities
    all of them together stay within the limit.
    """
    together = lines_together(result, k)
    return max(
        (
            (name, max(at.optical_density, math.log10(together * at.hazard_ratio)))
            if together > 1 and at.hazard_ratio > 0.0
            else (name, at.optical_density)
            for name, at in places(result, k).items()
        ),
        key=lambda found: found[1],
    )
