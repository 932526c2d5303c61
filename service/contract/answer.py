"""Requests to answers: the one way in for pages and for the API."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Sequence
from typing import Any, cast

import numpy as np

from service import __version__
from service.assess.aid import Aid
from service.assess.criteria import AVERAGE, EXPOSURE, RULES, TRAIN_RULE
from service.assess.evaluate import Evaluation, TargetResult, evaluate, optical_density
from service.assess.lines import PULSE, Lines
from service.assess.look import look
from service.assess.scales import spot_area_m2
from service.assess.steps import Step
from service.assess.viewing import over_distances
from service.assess.working import working
from service.contract.airspace import airspace_of
from service.contract.bench import bench_steps, setup_of
from service.contract.classification import hazard_classes
from service.contract.convert import behind_bench, lines_of
from service.contract.evaluation import Comparison, EvaluationResult
from service.contract.measures import measures_for
from service.contract.moving import (
    ScanAnswer,
    diffuse_answer,
    moving_notices,
    standing_still,
    swept_lines,
)
from service.contract.notices import aided_notices, notices_of
from service.contract.over_distance import over_distance_of
from service.contract.problem import FieldError, InvalidRequest
from service.contract.protection import protection_of
from service.contract.request import Aid as ViewingAid
from service.contract.request import EvaluationRequest
from service.contract.result import (
    AtDistance,
    Criterion,
    Duration,
    Provenance,
    RulesInfo,
    SumOfLines,
    TargetAnswer,
    step_model,
)
from service.contract.second_look import LONGER_SKIN, second_look
from service.files import DATA
from service.rules.compiled import CompiledRules, compiled_rules
from service.rules.eyewear import eyewear_tables
from service.rules.tables import read_toml

__all__ = [
    "aid_of",
    "answer",
    "cautions",
    "compare",
    "evaluate_batch",
    "evaluated",
    "rule_set",
    "rule_sets",
]


def rule_sets() -> dict[str, CompiledRules]:
    """Every compiled rule set by id, the default first."""
    return compiled_rules(DATA)


def cautions() -> list[str]:
    """The cautions that every result carries."""
    return list(read_toml(DATA / "phrases" / "en.toml")["cautions"].values())


CAUTIONS = cautions()


def rule_set(rules_id: str) -> CompiledRules:
    """The rule set of a request. Raises InvalidRequest naming the ids there are."""
    found = rule_sets().get(rules_id)
    if found is None:
        allowed = ", ".join(rule_sets())
        error = FieldError(
            field="rules",
            value=rules_id,
            allowed=allowed,
            message="unknown rule set",
            remedy="Choose one of the rule sets listed, or leave the field out.",
        )
        raise InvalidRequest(f"rules: there is no rule set {rules_id!r}", [error])
    return found


def evaluate_batch(requests: Sequence[EvaluationRequest], rules: CompiledRules) -> tuple[Lines, Evaluation]:
    """Lines and evaluation of direct beams in one pass, whatever rule set their requests name.

    At least one request; each figure is that of `answer`, for which a laser is a batch of one.
    """
    lines, _ = lines_of(requests, rules)
    with np.errstate(over="ignore", under="ignore"):
        return lines, evaluate(lines, rules)


def answer(request: EvaluationRequest) -> EvaluationResult:
    """Evaluate one request. Raises InvalidRequest where its rule set is unknown."""
    rules = rule_set(request.rules)
    lines, duration_rows = lines_of([request], rules)
    with np.errstate(over="ignore", under="ignore"):
        behind = behind_bench([request], lines)
        evaluation = evaluated(request, behind, rules)
        aid = request.viewing.aid
        aided = None if aid is None else evaluated(request, behind, rules, aid_of(aid))
        return _result(request, lines, evaluation, aided, duration_rows.tolist())


def compare(request: EvaluationRequest) -> Comparison:
    """The same request under every rule set."""
    rule_set(request.rules)
    return Comparison(results=[answer(request.model_copy(update={"rules": key})) for key in rule_sets()])


def evaluated(
    request: EvaluationRequest, lines: Lines, rules: CompiledRules, aid: Aid | None = None
) -> Evaluation:
    """One laser's lines behind its bench, with the limits as they change over distance where they do."""
    setup = setup_of(request.bench, lines)
    return evaluate(lines, rules, aid) if setup is None else look(setup, rules, aid)


def _scan(request: EvaluationRequest, evaluation: Evaluation, aided: Evaluation | None) -> ScanAnswer | None:
    """The sweep, and the case that it stops."""
    if evaluation.moving is None or evaluation.moving.setup.scan is None:
        return None
    still = evaluation.moving.still
    return ScanAnswer(
        lines=swept_lines(evaluation),
        failure_eye=_target(request, still, "eye"),
        failure_skin=_target(request, still, "skin"),
        failure_eye_aided=None if aided is None else _target(request, standing_still(aided), "eye"),
    )


def aid_of(aid: ViewingAid) -> Aid:
    """The optical aid of a request in SI."""
    return Aid(aid.objective_mm * 1e-3, aid.magnification, aid.transmittance)


def _result(
    request: EvaluationRequest,
    lines: Lines,
    evaluation: Evaluation,
    aided: Evaluation | None,
    duration_rows: list[int],
) -> EvaluationResult:
    rules, aid = evaluation.rules, request.viewing.aid
    published, standing = rules.rules, standing_still(evaluation)
    exposure = evaluation.lines.exposure_s
    durations = [_duration(evaluation, k, row) for k, row in enumerate(duration_rows)]
    same = float(exposure[0]) if (exposure == exposure[0]).all() else None
    inputs = request.model_copy(update={"exposure_s": same}).model_dump(mode="json", exclude_none=True)
    inputs.setdefault("exposure_s", None)
    canonical = json.dumps(inputs, sort_keys=True, separators=(",", ":"), allow_nan=False)
    first = [Step("T", d.basis, d.exposure_s, "s", d.source, d.known, d.line) for d in durations]
    classes = hazard_classes(lines)
    steps = bench_steps(request.bench, lines.beams, lines.wavelength_nm)
    return EvaluationResult(
        rules=RulesInfo.of(published),
        eye=_target(request, evaluation, "eye"),
        skin=_target(request, evaluation, "skin"),
        inputs=inputs,
        durations=durations,
        eye_aided=None if aided is None else _target(request, aided, "eye"),
        diffuse=diffuse_answer(evaluation, rules),
        scan=_scan(request, evaluation, aided),
        airspace=airspace_of(standing) if request.viewing.outdoors else None,
        over_distance=over_distance_of(request, evaluation),
        working=[step_model(s) for s in [*steps, *working(evaluation, 0, first)]],
        classification=classes,
        protection=protection_of(
            request,
            standing,
            None if aided is None or aid is None else (standing_still(aided), aid_of(aid)),
        ),
        measures=measures_for(
            classes[0].hazard_class, evaluation.lines.wavelength_nm.tolist(), _irradiance(standing)
        ),
        notices=[
            *(
                n
                for n in second_look(standing).notices(0)
                if evaluation.moving is None or n.code == LONGER_SKIN
            ),
            *moving_notices(evaluation),
            *notices_of(request, evaluation, 0),
            *aided_notices(aided),
        ],
        cautions=CAUTIONS,
        provenance=Provenance(
            service_version=__version__,
            rules_digest=published.digest,
            eyewear_digest=eyewear_tables(DATA).digest,
            request_digest=f"sha256:{hashlib.sha256(canonical.encode()).hexdigest()}",
        ),
    )


def _duration(evaluation: Evaluation, line: int, row: int) -> Duration:
    seconds = float(evaluation.lines.exposure_s[line])
    if row < 0:
        return Duration(
            line=line, exposure_s=seconds, basis="exposure duration as chosen", source="", known="entered"
        )
    published = evaluation.rules.rules
    entry = published.durations[row]
    return Duration(
        line=line,
        exposure_s=seconds,
        basis=f"none was chosen, so the rule set's conventional duration holds: {entry.words}",
        source=published.source_text(entry.source, entry.locator),
        known=cast(Any, entry.known),
    )


def _irradiance(evaluation: Evaluation) -> float:
    """Highest average irradiance of a line where it is narrowest [W/m2]."""
    lines = evaluation.lines
    places = lines.beams.narrowest_m().tolist()
    area = np.array([spot_area_m2(lines, k, place)[0] for k, place in enumerate(places)])
    return float((lines.average_power_w / area).max())


def _finite(x: float) -> float | None:
    """Infinity is told as null."""
    return float(x) if np.isfinite(x) else None


def _target(request: EvaluationRequest, evaluation: Evaluation, target: str) -> TargetAnswer:
    result = evaluation.target(target)
    far = _finite(result.far_m[0])
    worst = float(result.worst_ratio[0])
    sums = result.sums
    return TargetAnswer(
        hazard_distance_m=far,
        hazard_zone_m=None if far == 0.0 else (float(result.near_m[0]), far),
        hazard_ratio=worst,
        optical_density=float(optical_density(result.worst_ratio)[0]),
        worst_place_m=float(result.place_m[0]),
        governing=int(result.governing[0]),
        criteria=[_criterion(evaluation, result, k) for k in range(len(result.hazard_ratio))],
        sums=[]
        if sums is None
        else [
            SumOfLines(
                tissues=sorted(
                    {evaluation.rules.rules.limits[result.criteria.row[k]].tissue for k in members}
                ),
                lines=sorted({int(result.criteria.line[k]) for k in members}),
                criteria=[int(k) for k in members],
                hazard_ratio=float(sums.hazard_ratio[n]),
                hazard_distance_m=_finite(sums.far_m[n]),
            )
            for n, members in enumerate(sums.members)
            if len({int(result.criteria.line[k]) for k in members}) > 1
        ],
        at_distance=_at_distance(request, evaluation, target),
    )


def _at_distance(request: EvaluationRequest, evaluation: Evaluation, target: str) -> AtDistance | None:
    distance = request.viewing.distance_m
    if distance is None:
        return None
    _, each, sums = over_distances(evaluation, target, np.array([distance]))
    worst = float(sums[0])
    return AtDistance(
        distance_m=distance,
        hazard_ratio=worst,
        optical_density=float(optical_density(sums)[0]),
        exceeded=worst > 1.0,
        criteria_hazard_ratio=each[0].tolist(),
    )


def _criterion(evaluation: Evaluation, result: TargetResult, k: int) -> Criterion:
    criteria, found, lines = result.criteria, evaluation.exposures, evaluation.lines
    e, line = int(criteria.exposure[k]), int(criteria.line[k])
    rule = int(found.rule[e])
    row = evaluation.rules.rules.limits[criteria.row[k]]
    limit = float(criteria.limit_j_m2[k])
    if rule == EXPOSURE:
        per_second = 1.0 / float(lines.exposure_s[line])
    elif lines.mode[line] == PULSE:
        per_second = 1.0 / float(lines.pulse_s[line])
    else:
        per_second = float(lines.rate_hz[line])
    return Criterion(
        line=line,
        rule=cast(Any, RULES[rule]),
        tissue=row.tissue,
        effect=row.effect,
        row=row.row,
        limit_j_m2=limit,
        limit_w_m2=limit * per_second,
        aperture_mm=float(criteria.aperture_m[k]) * 1e3,
        duration_s=float(found.time_s[e]),
        exposure_j_m2=float(result.hazard_ratio[k]) * limit,
        pulses=float(found.count[e]) if rule in (AVERAGE, TRAIN_RULE) else None,
        pulse_factor=float(found.c_p[e]) if rule == TRAIN_RULE else None,
        hazard_ratio=float(result.hazard_ratio[k]),
        hazard_distance_m=_finite(result.distance_m[k]),
        source=evaluation.rules.rules.source_text(row.source, row.locator),
        known=cast(Any, row.known),
        note=row.note,
    )
