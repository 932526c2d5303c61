"""Parts of the result of contract v1. SI with the unit in the name; null = not applicable."""

from __future__ import annotations

from dataclasses import fields
from typing import Literal

from pydantic import BaseModel, ConfigDict, Field

from service.assess.steps import Step
from service.rules.ruleset import RuleSet

__all__ = [
    "AtDistance",
    "Criterion",
    "Duration",
    "Known",
    "Model",
    "Notice",
    "Provenance",
    "RulesInfo",
    "SumOfLines",
    "TargetAnswer",
    "WorkingStep",
    "step_model",
]

Known = Literal["read", "memory", "computed", "entered"]


class Model(BaseModel):
    """No NaN and no infinity leaves the service."""

    model_config = ConfigDict(allow_inf_nan=False)


class RulesInfo(Model):
    """The rule set that made the answer."""

    id: str
    title: str
    standing: str
    standing_text: str = Field(description="How its values are known, in plain words.")
    digest: str

    @classmethod
    def of(cls, rules: RuleSet) -> RulesInfo:
        """What an answer tells of its rule set."""
        return cls(**{name: getattr(rules, name) for name in cls.model_fields})


class Criterion(Model):
    """One criterion: a rule and a printed limit row, for one line."""

    line: int
    rule: Literal["exposure", "single", "average", "train"]
    tissue: str
    effect: str
    row: str
    limit_j_m2: float = Field(description="Per pulse (pulse, train) or over the whole exposure (cw).")
    limit_w_m2: float = Field(description="limit_j_m2 / T (cw), / pulse duration (pulse), x rate (train).")
    aperture_mm: float
    duration_s: float = Field(description="Duration at which the limit is taken.")
    exposure_j_m2: float = Field(description="Exposure at the most hazardous place, as limit_j_m2 counts it.")
    pulses: float | None = Field(description="Pulses N of the rule, not rounded.")
    pulse_factor: float | None = Field(description="C_P (C5) of the train rule.")
    hazard_ratio: float = Field(description="Exposure / limit at the most hazardous accessible place.")
    hazard_distance_m: float | None = Field(description="Of this criterion alone; null = unbounded.")
    source: str
    known: Known
    note: str


class SumOfLines(Model):
    """Lines whose exposures add: each enters with its worst criterion."""

    tissues: list[str]
    lines: list[int]
    criteria: list[int]
    hazard_ratio: float
    hazard_distance_m: float | None


class AtDistance(Model):
    """The exposure at the chosen viewing distance."""

    distance_m: float
    hazard_ratio: float
    optical_density: float
    exceeded: bool
    criteria_hazard_ratio: list[float]


class TargetAnswer(Model):
    """The answer for the eye or the skin."""

    hazard_distance_m: float | None = Field(description="0 = nothing exceeded; null = unbounded.")
    hazard_zone_m: tuple[float, float | None] | None = Field(description="null = nothing exceeded.")
    hazard_ratio: float
    optical_density: float
    worst_place_m: float
    governing: int = Field(description="Index into criteria, by the worst ratio of its own.")
    criteria: list[Criterion]
    sums: list[SumOfLines]
    at_distance: AtDistance | None


class Duration(Model):
    """The exposure duration of a line and why it was taken."""

    line: int
    exposure_s: float
    basis: str
    source: str
    known: Known


class WorkingStep(Model):
    """One step of the working."""

    symbol: str
    text: str
    value: float | None
    unit: str
    source: str
    known: Known
    line: int | None
    target: Literal["eye", "skin"] | None
    criterion: int | None


OF_STEP = tuple(f.name for f in fields(Step))


def step_model(step: Step) -> WorkingStep:
    """A step of the working as it leaves the service."""
    return WorkingStep.model_validate({name: getattr(step, name) for name in OF_STEP})


class Notice(Model):
    """Something the reader should look at; `field` names the input it is about."""

    code: str
    field: str | None
    text: str


class Provenance(Model):
    """What made this answer."""

    service_version: str
    rules_digest: str
    eyewear_digest: str
    request_digest: str
