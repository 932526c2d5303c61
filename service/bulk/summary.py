"""Summaries: a few figures per laser, from one pass over many, or from one whole answer."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from pydantic import ConfigDict, Field

from service import __version__
from service.bulk.findings import Findings, find
from service.contract.answer import answer, evaluate_batch, rule_set
from service.contract.evaluation import EvaluationResult
from service.contract.notices import input_notices, lasers_with_result_notices, notices_of
from service.contract.problem import ProblemDocument
from service.contract.request import EvaluationRequest
from service.contract.result import Model, RulesInfo, TargetAnswer
from service.contract.second_look import second_look
from service.rules.ruleset import TARGETS

__all__ = [
    "Closing",
    "Governing",
    "ProblemRecord",
    "Stopped",
    "Summary",
    "TargetSummary",
    "batched",
    "summaries",
    "summary_of",
]


class Governing(Model):
    """The criterion that governs: the worst ratio of its own."""

    model_config = ConfigDict(extra="forbid")

    line: int
    rule: str
    tissue: str
    effect: str
    row: str


class DistanceSummary(Model):
    """The exposure at the viewing distance of the request."""

    model_config = ConfigDict(extra="forbid")

    distance_m: float
    hazard_ratio: float
    optical_density: float
    exceeded: bool


class TargetSummary(Model):
    """The eye or the skin in short; the figures of the whole answer, not rounded."""

    model_config = ConfigDict(extra="forbid")

    hazard_distance_m: float | None = Field(description="0 = nothing exceeded; null = unbounded.")
    hazard_zone_m: tuple[float, float | None] | None = Field(description="null = nothing exceeded.")
    hazard_ratio: float
    optical_density: float
    governing: Governing
    at_distance: DistanceSummary | None = Field(description="null = the request names no viewing distance.")


class Stopped(Model):
    """A sweeping beam when it stops: eye, skin, and the eye behind an optical aid."""

    model_config = ConfigDict(extra="forbid")

    eye: TargetSummary
    skin: TargetSummary
    eye_aided: TargetSummary | None = Field(description="null = the request names no optical aid.")


class Summary(Model):
    """One laser in short."""

    model_config = ConfigDict(extra="forbid")

    index: int = Field(description="Place of the request among those sent, from 0.")
    label: str
    rules: str
    rules_digest: str
    eye: TargetSummary
    skin: TargetSummary
    eye_aided: TargetSummary | None = Field(description="null = the request names no optical aid.")
    stopped: Stopped | None = Field(description="null = nothing sweeps.")
    classes: dict[str, str] = Field(description="Hazard class by scheme, the default first.")
    notices: list[str] = Field(description="Codes of the notices; their text is in the full answer.")


class ProblemRecord(Model):
    """What stands in the place of a request that cannot be answered."""

    model_config = ConfigDict(extra="forbid")

    index: int
    problem: ProblemDocument


class Closing(Model):
    """The last record: without it the answer is not complete."""

    model_config = ConfigDict(extra="forbid")

    lasers: int = Field(description="Requests received.")
    answered: int
    problems: int
    complete: bool = Field(description="False where reading stopped before the end of what was sent.")
    stopped: str | None = Field(description="Why reading stopped.")
    rules: list[RulesInfo] = Field(description="The rule sets that were used, with their standing.")
    cautions: list[str]
    service_version: str = __version__


def batched(request: EvaluationRequest) -> bool:
    """Whether a request can be evaluated together with others: a direct beam, with nothing said of viewing.

    Any other is answered alone.
    """
    return not request.bench and not request.viewing.model_fields_set


def summaries(requests: Sequence[EvaluationRequest], index: Sequence[int]) -> list[dict[str, Any]]:
    """A summary of each request, in the form of `Summary`, in their order.

    Requests of one rule set are evaluated in one pass; every figure equals that of the whole answer.
    Raises InvalidRequest where a rule set is unknown.
    """
    groups: dict[str, list[int]] = {}
    found: list[dict[str, Any]] = [{}] * len(requests)
    for k, request in enumerate(requests):
        if batched(request):
            groups.setdefault(request.rules, []).append(k)
        else:
            found[k] = summary_of(answer(request), request.label, index[k])
    for rules_id, members in groups.items():
        chosen = [requests[k] for k in members]
        rules = rule_set(rules_id)
        findings = find(*evaluate_batch(chosen, rules))
        targets = [_targets(findings, target) for target in TARGETS]
        names = list(findings.classes)
        classes = zip(*(findings.class_names(name) for name in names), strict=True)
        codes = _codes(chosen, findings)
        digest = rules.rules.digest
        for k, request, eye, skin, each, notices in zip(
            members, chosen, *targets, classes, codes, strict=True
        ):
            found[k] = {
                "index": index[k],
                "label": request.label,
                "rules": rules_id,
                "rules_digest": digest,
                "eye": eye,
                "skin": skin,
                "eye_aided": None,
                "stopped": None,
                "classes": dict(zip(names, each, strict=True)),
                "notices": notices,
            }
    return found


def _targets(findings: Findings, target: str) -> list[dict[str, Any]]:
    """The part of each summary for one target."""
    found = findings.targets[target]
    if not np.isfinite([found.near_m, found.ratio, found.density]).all():
        raise ArithmeticError(f"{target}: a figure is not finite")
    columns = (
        found.near_m.tolist(),
        [None if far == np.inf else far for far in found.far_m.tolist()],
        found.ratio.tolist(),
        found.density.tolist(),
        found.line.tolist(),
        *findings.governing_names(target),
    )
    return [
        {
            "hazard_distance_m": far,
            "hazard_zone_m": None if far == 0.0 else (near, far),
            "hazard_ratio": ratio,
            "optical_density": density,
            "governing": {"line": line, "rule": rule, "tissue": tissue, "effect": effect, "row": row},
            "at_distance": None,
        }
        for near, far, ratio, density, line, rule, tissue, effect, row in zip(*columns, strict=True)
    ]


def _codes(requests: Sequence[EvaluationRequest], findings: Findings) -> list[list[str]]:
    """The codes of the notices of each request, each code once."""
    evaluation = findings.evaluation
    with np.errstate(over="ignore", under="ignore"):
        again = second_look(evaluation).codes()
        closer = lasers_with_result_notices(evaluation).tolist()
        exposure = evaluation.lines.exposure_s.tolist()
        found, first = [], 0
        for laser, request in enumerate(requests):
            end = first + len(request.lines)
            if closer[laser]:
                notices = notices_of(request, evaluation, laser)
            else:
                notices = input_notices(request, exposure[first:end])
            codes = again[laser] + [n.code for n in notices]
            found.append(list(dict.fromkeys(codes)) if len(codes) > 1 else codes)
            first = end
    return found


def summary_of(result: EvaluationResult, label: str, index: int) -> dict[str, Any]:
    """The summary of a whole answer."""
    scan, aided = result.scan, result.eye_aided
    return {
        "index": index,
        "label": label,
        "rules": result.rules.id,
        "rules_digest": result.rules.digest,
        "eye": _target_of(result.eye),
        "skin": _target_of(result.skin),
        "eye_aided": None if aided is None else _target_of(aided),
        "stopped": None
        if scan is None
        else {
            "eye": _target_of(scan.failure_eye),
            "skin": _target_of(scan.failure_skin),
            "eye_aided": None if scan.failure_eye_aided is None else _target_of(scan.failure_eye_aided),
        },
        "classes": {c.scheme: c.hazard_class for c in result.classification},
        "notices": list(dict.fromkeys(n.code for n in result.notices)),
    }


def _target_of(target: TargetAnswer) -> dict[str, Any]:
    criterion = target.criteria[target.governing]
    return {
        "hazard_distance_m": target.hazard_distance_m,
        "hazard_zone_m": target.hazard_zone_m,
        "hazard_ratio": target.hazard_ratio,
        "optical_density": target.optical_density,
        "governing": {name: getattr(criterion, name) for name in Governing.model_fields},
        "at_distance": None
        if target.at_distance is None
        else {name: getattr(target.at_distance, name) for name in DistanceSummary.model_fields},
    }
