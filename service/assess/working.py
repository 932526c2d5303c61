"""The working: how an answer came about, step by step, for a pocket calculator."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from service.assess.evaluate import Evaluation
from service.assess.lines import TRAIN
from service.assess.steps import Step, number
from service.assess.working_target import target_steps
from service.rules.factors import Factor
from service.rules.grid import SMALL_SOURCE_MRAD
from service.rules.ruleset import TARGETS

__all__ = ["working"]


def working(evaluation: Evaluation, laser: int, durations: list[Step]) -> list[Step]:
    """The steps for one laser of an evaluation; `durations` holds one step per line for T."""
    lines = np.flatnonzero(evaluation.lines.laser == laser)
    steps: list[Step] = []
    for local, line in enumerate(lines):
        steps += _line_steps(evaluation, int(line), local, durations[local])
    for target in TARGETS:
        steps += target_steps(evaluation, laser, target, int(lines[0]))
    return steps


def _line_steps(evaluation: Evaluation, line: int, local: int, duration: Step) -> Iterator[Step]:
    """Inputs and factors of one line."""
    rules, at = evaluation.rules, evaluation.conditions
    wavelength, alpha = float(at.wavelength_nm[line]), float(at.subtense_mrad[line])
    given = float(evaluation.lines.subtense_mrad[line])
    yield Step("lambda", "wavelength as entered", wavelength, "nm", known="entered", line=local)
    yield duration
    text = "angular subtense of the apparent source as entered"
    if given < SMALL_SOURCE_MRAD:
        text = f"angular subtense {number(given)} mrad, counted as alpha_min = {SMALL_SOURCE_MRAD:g} mrad"
    yield Step("alpha", text, alpha, "mrad", known="entered", line=local)
    used = {token for token, _, rows in rules.tokens if rows[_rows_of(evaluation, line)].any()}
    for name in (n for n in rules.line_factors if n in used):
        yield _factor_step(evaluation, rules.factors[name], wavelength, float(at.factors[name][line]), local)
    counts = evaluation.lines.mode[line] == TRAIN and rules.repetition.within_long_break
    if at.extended[line] or counts:
        yield _factor_step(evaluation, rules.factor("long_break"), alpha, float(at.long_break_s[line]), local)


def _rows_of(evaluation: Evaluation, line: int) -> list[int]:
    """Numbers of the limit rows that any criterion of a line uses."""
    return [
        int(row)
        for target in TARGETS
        for criteria in (evaluation.target(target).criteria,)
        for row in criteria.row[criteria.line == line]
    ]


def _factor_step(evaluation: Evaluation, factor: Factor, x: float, value: float, line: int) -> Step:
    row = factor.rows[int(factor.piece(np.array([x]))[0])]
    return Step(
        factor.name,
        f"{factor.name} = {row.expression(x)}",
        value,
        factor.unit,
        evaluation.rules.rules.source_text(row.source, row.locator),
        row.known,
        line,
    )
