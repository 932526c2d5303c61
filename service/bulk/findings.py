"""What one pass over a batch finds, as columns: one element per laser."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.assess.classification import classify
from service.assess.criteria import RULES
from service.assess.evaluate import Evaluation, TargetResult, optical_density
from service.assess.lines import Lines
from service.contract.classification import schemes
from service.rules.ruleset import TARGETS

__all__ = ["Findings", "TargetFindings", "find"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]


@dataclass(slots=True)
class TargetFindings:
    """Eye or skin, one element per laser.

    `near_m`, `far_m`: ends of the hazard zone [m], 0 where nothing is exceeded, infinite where a beam
    never falls below its limit. `ratio`: worst exposure / limit, `density` the optical density for it.
    The governing criterion: `line` of the laser from 0, `rule` (index into RULES), `row` (limit row).
    """

    near_m: Floats
    far_m: Floats
    ratio: Floats
    density: Floats
    line: Ints
    rule: Ints
    row: Ints

    @classmethod
    def of(cls, evaluation: Evaluation, result: TargetResult) -> TargetFindings:
        """The columns of one target."""
        laser, criteria, k = evaluation.lines.laser, result.criteria, result.governing
        first = np.flatnonzero(np.r_[True, laser[1:] != laser[:-1]])
        return cls(
            near_m=result.near_m,
            far_m=result.far_m,
            ratio=result.worst_ratio,
            density=optical_density(result.worst_ratio),
            line=criteria.line[k] - first,
            rule=evaluation.exposures.rule[criteria.exposure[k]],
            row=criteria.row[k].astype(np.intp),
        )


@dataclass(slots=True)
class Findings:
    """Both targets by name, and the class of each laser by scheme (index into its classes)."""

    evaluation: Evaluation
    targets: dict[str, TargetFindings]
    classes: dict[str, Ints]

    def governing_names(self, target: str) -> tuple[list[str], list[str], list[str], list[str]]:
        """Rule, tissue, effect and row of the governing criterion of each laser."""
        found, limits = self.targets[target], self.evaluation.rules.rules.limits
        rows = [limits[k] for k in found.row.tolist()]
        return (
            [RULES[k] for k in found.rule.tolist()],
            [row.tissue for row in rows],
            [row.effect for row in rows],
            [row.row for row in rows],
        )

    def class_names(self, scheme: str) -> list[str]:
        """The class of each laser under a scheme."""
        names = [rule.name for rule in schemes()[scheme].scheme.classes]
        return [names[k] for k in self.classes[scheme].tolist()]


def find(lines: Lines, evaluation: Evaluation) -> Findings:
    """The findings of a batch; `lines` as they leave the lasers, by which the class is found."""
    with np.errstate(over="ignore", under="ignore"):
        classes = {key: classify(lines, scheme).number for key, scheme in schemes().items()}
        targets = {t: TargetFindings.of(evaluation, evaluation.target(t)) for t in TARGETS}
    return Findings(evaluation, targets, classes)
