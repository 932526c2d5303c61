"""Sweeps: the answer as a function of one input, from one pass over arrays (large ones in a few)."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field, ValidationError, model_validator

from service import __version__
from service.assess.classification import classify
from service.assess.criteria import EXPOSURE, RULES
from service.assess.evaluate import Evaluation, TargetResult, optical_density
from service.assess.lines import PULSE
from service.contract.answer import aid_of, cautions, evaluated, rule_set
from service.contract.bench import setup_of
from service.contract.classification import schemes
from service.contract.convert import behind_bench, lines_of
from service.contract.problem import FieldError, InvalidRequest, invalid_request
from service.contract.request import EvaluationRequest, Line
from service.contract.result import Model, RulesInfo
from service.contract.strict import Strict
from service.rules.compiled import CompiledRules

__all__ = [
    "FIELDS",
    "MAX_POINTS",
    "Sweep",
    "SweepAnswer",
    "SweepField",
    "SweepRequest",
    "SweptTarget",
    "sweep",
]

Floats = NDArray[np.float64]

MAX_POINTS = 5000
#: Most values where each must be solved by itself.
MAX_MOVING = 301
#: Lines that one pass over arrays takes, which bounds the memory it needs.
LINES_AT_ONCE = 8192
SweepField = Literal[
    "wavelength_nm",
    "power_w",
    "energy_j",
    "average_power_w",
    "pulse_s",
    "rate_hz",
    "diameter_mm",
    "divergence_mrad",
    "exposure_s",
]
#: The fields that can be swept, with the part of a line that holds each (blank: the line itself).
FIELDS: dict[str, str] = {
    "wavelength_nm": "",
    "power_w": "emission",
    "energy_j": "emission",
    "average_power_w": "emission",
    "pulse_s": "emission",
    "rate_hz": "emission",
    "diameter_mm": "beam",
    "divergence_mrad": "beam",
    "exposure_s": "",
}
PAIRS = ("diameter_mm", "divergence_mrad")


class Sweep(Strict):
    """Which input runs, and over what."""

    field: SweepField = Field(description="The input, by its name in the request.")
    line: int = Field(0, ge=0, le=15, description="Its line, counted from 0; exposure_s has none.")
    start: float = Field(description="First value, in the unit that the name of the field ends with.")
    stop: float = Field(description="Last value, above the first.")
    points: int = Field(201, ge=2, le=MAX_POINTS)
    spacing: Literal["log", "linear"] = "log"

    @model_validator(mode="after")
    def _upwards(self) -> Sweep:
        if self.stop <= self.start:
            raise ValueError("stop must lie above start")
        if self.spacing == "log" and self.start <= 0.0:
            raise ValueError("a logarithmic sweep starts above 0; use linear spacing")
        return self

    def values(self) -> list[float]:
        """The values, each with digits enough for a hundredth of a step; the ends as given."""
        if self.spacing == "log":
            places = np.geomspace(self.start, self.stop, self.points)
        else:
            places = np.linspace(self.start, self.stop, self.points)
        step = float((np.diff(places) / np.abs(places[1:])).min())
        digits = min(17, 3 - math.floor(math.log10(step)))
        inner = [float(f"{v:.{digits}g}") for v in places[1:-1].tolist()]
        return [self.start, *inner, self.stop]


class SweepRequest(Strict):
    """One laser and the input that runs."""

    evaluation: EvaluationRequest
    sweep: Sweep


class SweptTarget(Model):
    """Eye or skin at every value; lists run along the values."""

    hazard_distance_m: list[float | None] = Field(description="0 = nothing exceeded; null = unbounded.")
    hazard_near_m: list[float | None] = Field(description="Near end of the zone; null = nothing exceeded.")
    hazard_ratio: list[float]
    optical_density: list[float]
    limit_j_m2: list[float] = Field(description="Of the governing criterion, as in an evaluation.")
    limit_w_m2: list[float]
    rule: list[str]
    tissue: list[str]
    row: list[str] = Field(description="The published row that governs.")
    known: list[str] = Field(description="How that row is known.")
    line: list[int]


class SweepAnswer(Model):
    """The answer over the values of one input."""

    rules: RulesInfo
    sweep: Sweep
    values: list[float]
    exposure_s: list[float] = Field(description="Exposure duration of the swept line at each value.")
    eye: SweptTarget
    skin: SweptTarget
    eye_aided: SweptTarget | None = Field(description="The eye behind viewing.aid; null without one.")
    hazard_class: dict[str, list[str]] = Field(description="Class at each value under every scheme.")
    remarks: list[str] = Field(description="What is held while the input runs.")
    inputs: dict[str, Any] = Field(description="The request of the laser.")
    cautions: list[str]
    service_version: str

    def targets(self) -> list[tuple[str, str, SweptTarget]]:
        """Key, name and figures of every target there is."""
        found = [("eye", "Eye", self.eye), ("skin", "Skin", self.skin)]
        return found if self.eye_aided is None else [*found, ("eye_aided", "Aided", self.eye_aided)]


def sweep(request: SweepRequest) -> SweepAnswer:
    """Evaluate one laser at every value of an input. Raises InvalidRequest where a value cannot be used."""
    asked, laser = request.sweep, request.evaluation
    rules = rule_set(laser.rules)
    moving = setup_of(laser.bench, lines_of([laser], rules)[0]) is not None
    if asked.points > MAX_MOVING and moving:
        raise _refuse(
            "sweep.points",
            asked.points,
            f"2 to {MAX_MOVING} where the limits change with the distance (diffuser, scanner)",
            "too many values for this bench",
            "Ask for fewer values, or in several sweeps.",
        )
    values = asked.values()
    requests = _requests(laser, asked, values)
    size = 1 if moving else max(1, LINES_AT_ONCE // len(laser.lines))
    with np.errstate(over="ignore", under="ignore"):
        parts = [_part(requests[k : k + size], rules, asked) for k in range(0, len(requests), size)]
    published = rules.rules
    return SweepAnswer(
        rules=RulesInfo.of(published),
        sweep=asked,
        values=values,
        exposure_s=[seconds for part in parts for seconds in part.exposure_s],
        eye=_joined([part.targets["eye"] for part in parts]),
        skin=_joined([part.targets["skin"] for part in parts]),
        eye_aided=_joined([part.targets["eye_aided"] for part in parts]) if laser.viewing.aid else None,
        hazard_class={key: [n for part in parts for n in part.classes[key]] for key in schemes()},
        remarks=_remarks(laser, asked),
        inputs=laser.model_dump(mode="json", exclude_none=True),
        cautions=cautions(),
        service_version=__version__,
    )


@dataclass(frozen=True, slots=True)
class _Part:
    """The figures of some of the values: durations of the swept line, targets and classes by their keys."""

    exposure_s: list[float]
    targets: dict[str, SweptTarget]
    classes: dict[str, list[str]]


def _part(requests: list[EvaluationRequest], rules: CompiledRules, asked: Sweep) -> _Part:
    """One evaluation of requests that differ in one value; of one request where its limits move."""
    lines, _ = lines_of(requests, rules)
    behind, first = behind_bench(requests, lines), requests[0]
    plain = evaluated(first, behind, rules)
    targets = {name: _target(plain, plain.target(name)) for name in ("eye", "skin")}
    if first.viewing.aid is not None:
        aided = evaluated(first, behind, rules, aid_of(first.viewing.aid))
        targets["eye_aided"] = _target(aided, aided.eye)
    classes = {}
    for key, scheme in schemes().items():
        names = [c.name for c in scheme.scheme.classes]
        classes[key] = [names[k] for k in classify(lines, scheme).number.tolist()]
    line = 0 if asked.field == "exposure_s" else asked.line
    return _Part(lines.exposure_s[line :: len(first.lines)].tolist(), targets, classes)


def _joined(parts: list[SweptTarget]) -> SweptTarget:
    """The figures of several batches, one after the other."""
    names = SweptTarget.model_fields
    return SweptTarget(**{n: [value for part in parts for value in getattr(part, n)] for n in names})


def _refuse(field: str, value: Any, allowed: str, message: str, remedy: str) -> InvalidRequest:
    error = FieldError(field=field, value=value, allowed=allowed, message=message, remedy=remedy)
    return InvalidRequest(f"{field}: {message}", [error])


def _requests(laser: EvaluationRequest, asked: Sweep, values: list[float]) -> list[EvaluationRequest]:
    """The laser at every value, each validated as a request of its own."""
    if asked.field == "exposure_s":
        for end in (asked.start, asked.stop):
            _check(laser, {"exposure_s": end}, asked, end)
        return [laser.model_copy(update={"exposure_s": v}) for v in values]
    if asked.line >= len(laser.lines):
        most = len(laser.lines) - 1
        raise _refuse("sweep.line", asked.line, f"0 to {most}", "there is no such line", "Choose a line.")
    line = laser.lines[asked.line].model_dump(exclude_none=True)
    part = line[FIELDS[asked.field]] if FIELDS[asked.field] else line
    if asked.field not in part:
        there = [n for n, place in FIELDS.items() if n in (line[place] if place else line)]
        raise _refuse(
            "sweep.field",
            asked.field,
            ", ".join([*there, "exposure_s"]),
            "this line does not give that input",
            "Sweep an input that the line gives, or give the line by this one.",
        )
    given = part[asked.field]
    before, after = laser.lines[: asked.line], laser.lines[asked.line + 1 :]
    found = []
    for value in values:
        part[asked.field] = _scaled(given, value) if asked.field in PAIRS else value
        try:
            changed = Line.model_validate(line)
        except ValidationError:
            _check(laser, {"lines": [*before, line, *after]}, asked, value)
            raise
        found.append(laser.model_copy(update={"lines": [*before, changed, *after]}))
    return found


def _scaled(given: Any, value: float) -> list[float]:
    """Both axes of a diameter or divergence: the second keeps its proportion to the first."""
    first, second = given if isinstance(given, list | tuple) else (given, given)
    return [value, value * second / first if first > 0.0 else value]


def _check(laser: EvaluationRequest, changes: dict[str, Any], asked: Sweep, value: float) -> None:
    """Refuse a value that no request may hold, as one of the sweep's ends."""
    given = {name: getattr(laser, name) for name in EvaluationRequest.model_fields}
    try:
        EvaluationRequest.model_validate({**given, **changes})
    except ValidationError as error:
        (first, *_) = invalid_request(error).errors
        end = "start" if value == asked.start else "stop"
        allowed = first.allowed.removesuffix(", or a list of two")
        raise _refuse(f"sweep.{end}", value, allowed, first.message, first.remedy) from None


def _remarks(laser: EvaluationRequest, asked: Sweep) -> list[str]:
    remarks = []
    emission = laser.lines[min(asked.line, len(laser.lines) - 1)].emission
    if asked.field == "rate_hz":
        held = "energy of a pulse" if getattr(emission, "energy_j", None) is not None else "average power"
        remarks.append(f"The {held} is held while the rate runs, as the request gives it.")
    if asked.field == "pulse_s":
        remarks.append("The energy of a pulse is held while its duration runs.")
    if asked.field in PAIRS:
        remarks.append("The value is that of the first axis; an elliptical beam keeps its proportion.")
    if asked.field == "wavelength_nm" and laser.exposure_s is None:
        remarks.append("Each wavelength takes its own conventional exposure duration; a step in it shows.")
    if laser.bench and laser.bench[-1].element == "scanner":
        remarks.append("The figures hold while the beam sweeps; an evaluation tells of one that stops.")
    if len(laser.lines) > 1 and asked.field != "exposure_s":
        remarks.append(f"Line {asked.line + 1} runs; the other lines stay and add as in an evaluation.")
    return remarks


def _target(evaluation: Evaluation, result: TargetResult) -> SweptTarget:
    """The figures of one target along the values."""
    criteria, found, lines = result.criteria, evaluation.exposures, evaluation.lines
    k = result.governing
    exposure, line = criteria.exposure[k], criteria.line[k]
    rule = found.rule[exposure]
    per_second = np.where(
        rule == EXPOSURE,
        1.0 / lines.exposure_s[line],
        np.where(lines.mode[line] == PULSE, 1.0 / lines.pulse_s[line], lines.rate_hz[line]),
    )
    rows = [evaluation.rules.rules.limits[n] for n in criteria.row[k].tolist()]
    first_line = np.searchsorted(lines.laser, np.arange(lines.lasers))
    limit = criteria.limit_j_m2[k]
    return SweptTarget(
        hazard_distance_m=[None if np.isinf(f) else f for f in result.far_m.tolist()],
        hazard_near_m=[
            None if f == 0.0 else n
            for n, f in zip(result.near_m.tolist(), result.far_m.tolist(), strict=True)
        ],
        hazard_ratio=result.worst_ratio.tolist(),
        optical_density=optical_density(result.worst_ratio).tolist(),
        limit_j_m2=limit.tolist(),
        limit_w_m2=(limit * per_second).tolist(),
        rule=[RULES[n] for n in rule.tolist()],
        tissue=[row.tissue for row in rows],
        row=[row.row for row in rows],
        known=[row.known for row in rows],
        line=(line - first_line[lines.laser[line]]).tolist(),
    )
