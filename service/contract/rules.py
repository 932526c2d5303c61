"""Rule sets as JSON: the rows as printed, with sources."""

from __future__ import annotations

from dataclasses import asdict
from typing import Any

from pydantic import BaseModel, Field

from service.files import DATA
from service.rules.classes import ClassScheme
from service.rules.limit_set import LimitSet
from service.rules.materials import materials
from service.rules.ruleset import RuleSet

__all__ = [
    "MaterialSummary",
    "RuleSetDocument",
    "RuleSetSummary",
    "SchemeDocument",
    "material_list",
    "rule_set_document",
    "rule_set_summary",
    "scheme_document",
]


class RuleSetSummary(BaseModel):
    """A rule set in one line."""

    id: str
    title: str
    standing: str
    standing_text: str
    digest: str


class RuleSetDocument(RuleSetSummary):
    """A rule set with every row; columns are those of the tables, `line` is left out."""

    limits: list[dict[str, Any]] = Field(
        description="coefficient x t^time_power x factors, H or E, at most cap."
    )
    factors: list[dict[str, Any]]
    apertures: list[dict[str, Any]]
    durations: list[dict[str, Any]]
    repetition: list[dict[str, Any]]
    additivity: list[dict[str, Any]]
    steps: dict[str, dict[str, Any]] = Field(description="The subtense factor and the field factor.")
    shared_boundaries: dict[str, list[float]] = Field(
        description="Printed boundaries on which both rows are judged (the stricter holds)."
    )
    sources: dict[str, dict[str, Any]]


def rule_set_summary(rules: LimitSet) -> RuleSetSummary:
    """The summary of a rule set."""
    return RuleSetSummary(
        id=rules.id,
        title=rules.title,
        standing=rules.standing,
        standing_text=rules.standing_text,
        digest=rules.digest,
    )


class SchemeDocument(RuleSetSummary):
    """A classification scheme with every row."""

    classes: list[dict[str, Any]]
    ceiling: str
    fallback: dict[str, str]
    remarks: list[str]
    limits: list[dict[str, Any]] = Field(description="As for rule sets; Q and P rows in J and W.")
    factors: list[dict[str, Any]]
    growth: dict[str, Any] | None
    measurement: list[dict[str, Any]]
    time_bases: list[dict[str, Any]]
    repetition: list[dict[str, Any]]


def scheme_document(scheme: ClassScheme) -> SchemeDocument:
    """A classification scheme with every row."""
    return SchemeDocument(
        **rule_set_summary(scheme).model_dump(),
        classes=[asdict(rule) for rule in scheme.classes],
        ceiling=scheme.ceiling,
        fallback=scheme.fallback,
        remarks=list(scheme.remarks),
        limits=_rows(scheme.limits),
        factors=_rows(scheme.factors),
        growth=None if scheme.growth is None else asdict(scheme.growth),
        measurement=_rows(scheme.measurement),
        time_bases=_rows(scheme.time_bases),
        repetition=_rows(scheme.repetition),
    )


class MaterialSummary(BaseModel):
    """One material at one wavelength."""

    material: str
    wavelength_nm: float
    refractive_index: float | None
    reflectance: float | None
    source: str
    known: str
    note: str


def material_list() -> list[MaterialSummary]:
    """Every row of the table of materials."""
    names = MaterialSummary.model_fields
    rows = [row for rows in materials(DATA).values() for row in rows]
    return [MaterialSummary(**{n: getattr(row, n) for n in names}) for row in rows]


def _rows(rows: tuple[Any, ...]) -> list[dict[str, Any]]:
    return [{key.rstrip("_"): value for key, value in asdict(row).items() if key != "line"} for row in rows]


def rule_set_document(rules: RuleSet) -> RuleSetDocument:
    """A rule set with every row and the documents that its rows name."""
    tables = (
        rules.limits,
        rules.factors,
        rules.apertures,
        rules.durations,
        rules.repetition,
        rules.additivity,
    )
    named = {row.source for table in tables for row in table} | {rules.document, rules.subtense.source}
    return RuleSetDocument(
        **rule_set_summary(rules).model_dump(),
        limits=_rows(rules.limits),
        factors=_rows(rules.factors),
        apertures=_rows(rules.apertures),
        durations=_rows(rules.durations),
        repetition=_rows(rules.repetition),
        additivity=_rows(rules.additivity),
        steps={"subtense": asdict(rules.subtense), "field": asdict(rules.field)},
        shared_boundaries={
            "wavelength_nm": list(rules.shared_wavelengths_nm),
            "time_s": list(rules.shared_times_s),
        },
        sources={key: asdict(source) for key, source in rules.sources.items() if key in named},
    )
