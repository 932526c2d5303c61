"""Hazard classes in the answer."""

from __future__ import annotations

from decimal import ROUND_CEILING, Context, Decimal
from typing import Any, cast

import numpy as np
from pydantic import Field

from service.assess.classification import Classification, classify
from service.assess.criteria import EXPOSURE, RULES
from service.assess.lines import Lines
from service.assess.steps import Step
from service.assess.working_class import class_steps, limiting
from service.contract.result import Known, Model, WorkingStep, step_model
from service.files import DATA
from service.rules.classes import CompiledScheme, compiled_schemes

__all__ = ["ClassLevel", "HazardClass", "hazard_classes", "schemes"]


class ClassLevel(Model):
    """The limits of one class against the accessible emission: the criterion that comes closest."""

    limits: str = Field(description="Name of the limits, as the scheme names the class.")
    holds: bool
    ratio: float = Field(description="Accessible emission / limit, lines added, worst condition.")
    margin: str
    condition: str | None = Field(description="Measurement condition of the limiting criterion.")
    line: int | None
    rule: str | None
    row: str | None
    accessible_emission: float | None
    limit: float | None
    unit: str | None
    source: str
    known: Known
    note: str


class HazardClass(Model):
    """The class of the laser under one scheme."""

    scheme: str
    title: str
    standing: str
    standing_text: str
    digest: str
    hazard_class: str
    levels: list[ClassLevel]
    remarks: list[str]
    working: list[WorkingStep]


def schemes() -> dict[str, CompiledScheme]:
    """Every classification scheme by id, the default first."""
    return compiled_schemes(DATA)


def hazard_classes(lines: Lines) -> list[HazardClass]:
    """The class of one laser under every scheme."""
    found = []
    for key, scheme in schemes().items():
        result = classify(lines, scheme)
        published = scheme.scheme
        number = int(result.number[0])
        found.append(
            HazardClass(
                scheme=key,
                title=published.title,
                standing=published.standing,
                standing_text=published.standing_text,
                digest=published.digest,
                hazard_class=published.classes[number].name,
                levels=[_level(result, target) for target in result.limits],
                remarks=list(published.remarks),
                working=[step_model(s) for s in _steps(result)],
            )
        )
    return found


def _steps(result: Classification) -> list[Step]:
    """The working of every level."""
    return [step for target in result.limits for step in class_steps(result, target)]


def margin_text(limits: str, ratio: float) -> str:
    """How far the emission is from the limits: 'Class 3R exceeded 4.20 times'."""
    if ratio > 1.0:
        times = Context(prec=3, rounding=ROUND_CEILING).create_decimal(Decimal(repr(ratio)))
        return f"Class {limits} exceeded {times:f} times"
    return f"Class {limits} holds with {np.floor(100.0 * (1.0 - ratio)):.0f} % left"


def _level(result: Classification, target: str) -> ClassLevel:
    table = result.limits[target]
    ratio = max(float(r[0]) for r in result.ratio[target].values())
    where = limiting(result, target)
    base: dict[str, Any] = {
        "limits": target,
        "holds": ratio <= 1.0,
        "ratio": ratio,
        "margin": margin_text(target, ratio),
    }
    if where is None:
        text = "this class has no limits at these wavelengths; those of the class it falls back on are used"
        return ClassLevel(
            **base,
            **dict.fromkeys(
                ("condition", "line", "rule", "row", "accessible_emission", "limit", "unit"), cast(Any, None)
            ),
            source="",
            known="computed",
            note=text,
        )
    k, condition = where
    row = result.scheme.scheme.limits[table.row[k]]
    rule = int(table.exposures.rule[table.exposure[k]])
    per_area = "/m2" if result.scheme.per_area[table.row[k]] else ""
    scale, unit = 1.0, f"J{per_area}"
    if rule == EXPOSURE:
        scale, unit = float(table.exposures.time_s[table.exposure[k]]), f"W{per_area}"
    return ClassLevel(
        **base,
        condition=condition,
        line=int(table.line[k]),
        rule=RULES[rule],
        row=row.row,
        accessible_emission=float(table.emission[condition][k]) / scale,
        limit=float(table.limit[k]) / scale,
        unit=unit,
        source=result.scheme.scheme.source_text(row.source, row.locator),
        known=cast(Any, row.known),
        note=row.note,
    )
