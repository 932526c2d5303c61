"""Hazard classes in the answer."""

from __future__ import annotations

from typing import Any, cast

import numpy as np
from pydantic import Field

from service.assess.classification import HOLDS, UNAIDED, Classification, classify
from service.assess.criteria import EXPOSURE, RULES
from service.assess.lines import Lines
from service.assess.steps import Step, number_up
from service.assess.working_class import class_steps, limiting
from service.contract.result import Known, Model, WorkingStep, step_model
from service.files import DATA
from service.rules.classes import ClassRule, CompiledScheme, compiled_schemes

__all__ = ["ClassLevel", "HazardClass", "hazard_classes", "margin_text", "schemes"]


class ClassLevel(Model):
    """The limits of one class against the accessible emission: the criterion that comes closest."""

    limits: str = Field(description="Name of the limits, as the scheme names the class.")
    available: bool = Field(description="Whether a class with these limits exists at these wavelengths.")
    holds: bool = Field(description="The limits are kept under every condition; false where not available.")
    ratio: float = Field(
        description="Accessible emission / limit, lines added, worst condition; where the class is not "
        "available, by the limits it falls back on."
    )
    ratios: dict[str, float] = Field(description="The same ratio under each measurement condition by name.")
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
    reason: str = Field(description="Which limits, under which conditions, make this the class.")
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
                reason=reason_text(published.classes[number], result),
                levels=[_level(result, target) for target in result.limits],
                remarks=list(published.remarks),
                working=[step_model(s) for s in _steps(result)],
            )
        )
    return found


def _steps(result: Classification) -> list[Step]:
    """The working of every level."""
    return [step for target in result.limits for step in class_steps(result, target)]


def _three_digits(value: float) -> str:
    """Rounded up to three digits; what exceeds them by rounding alone is not rounded up."""
    return number_up(value / HOLDS)


def _verdict(ratio: float) -> str:
    """'exceeded 4.20 times' or 'holds with 60 % left', rounded to the safe side."""
    if ratio > HOLDS:
        return f"exceeded {_three_digits(ratio)} times"
    return f"holds with {max(0.0, np.floor(100.0 * (HOLDS - ratio))):.0f} % left"


def margin_text(limits: str, ratios: dict[str, float]) -> str:
    """How far the emission is from the limits, by measurement condition.

    'Class 3R exceeded 4.20 times'; where the conditions disagree both are told: 'Class 1: naked eye holds
    with 80 % left, with viewing optics exceeded 6.15 times'.
    """
    unaided, worst = ratios[UNAIDED], max(ratios.values())
    if unaided <= HOLDS < worst:
        return f"Class {limits}: naked eye {_verdict(unaided)}, with viewing optics {_verdict(worst)}"
    return f"Class {limits} {_verdict(worst)}"


def _ratios(result: Classification, target: str) -> dict[str, float]:
    return {condition: float(r[0]) for condition, r in result.ratio[target].items()}


def reason_text(rule: ClassRule, result: Classification) -> str:
    """Why the laser is in a class."""
    if rule.limits is None:
        ceiling = result.scheme.scheme.ceiling
        worst = max(_ratios(result, ceiling).values())
        return (
            f"the limits of Class {ceiling} are {_verdict(worst)}"
            if worst > HOLDS
            else "no other class holds"
        )
    ratios = _ratios(result, rule.limits)
    if rule.aided_limits is None:
        return f"the limits of Class {rule.limits} hold ({_three_digits(max(ratios.values()))} of the limit)"
    aided = max(r for condition, r in ratios.items() if condition != UNAIDED)
    return (
        f"naked eye within Class {rule.limits} ({_three_digits(ratios[UNAIDED])} of the limit); with viewing "
        f"optics {_verdict(aided)} but below Class {rule.aided_limits}"
    )


def _level(result: Classification, target: str) -> ClassLevel:
    table = result.limits[target]
    ratios = _ratios(result, target)
    available = bool(result.available[target][0])
    places = "this wavelength" if len(set(result.lines.wavelength_nm)) == 1 else "these wavelengths"
    where = limiting(result, target)
    base: dict[str, Any] = {
        "limits": target,
        "available": available,
        "holds": available and max(ratios.values()) <= HOLDS,
        "ratio": max(ratios.values()),
        "ratios": ratios,
        "margin": margin_text(target, ratios)
        if available
        else f"Class {target} is not available at {places}",
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
