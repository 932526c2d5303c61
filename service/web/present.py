"""How an answer is put into words and rows for pages."""

from __future__ import annotations

from dataclasses import fields
from typing import Any

from service.assess.steps import limit_expression
from service.contract.evaluation import EvaluationResult
from service.contract.eyewear_asked import density_asked, lines_together
from service.contract.moving import DiffuseAnswer
from service.contract.result import Criterion, SumOfLines, TargetAnswer, WorkingStep
from service.rules.eyewear import ScaleRow
from service.rules.limit_set import LimitSet
from service.rules.tables import FactorRow, LimitRow, RepetitionRow, Row
from service.web.fields import ELEMENTS, FIELDS
from service.web.numbers import plain, shown_down, shown_up, typeset
from service.web.units import base_unit

__all__ = [
    "KNOWN",
    "RULE_NAMES",
    "all_day",
    "band",
    "class_sentence",
    "documents",
    "duration",
    "element",
    "exactly",
    "eyewear_sentence",
    "factor_band",
    "factor_text",
    "governing",
    "governing_sum",
    "headline",
    "limit_text",
    "reason",
    "repetition_text",
    "rows_of",
    "scale",
    "scale_limit_text",
    "sources",
    "spoken",
    "targets_of",
    "viewing",
    "working_value",
]

RULE_NAMES = {
    "exposure": "whole exposure",
    "single": "single pulse",
    "average": "average power",
    "train": "pulse train",
}
QUANTITY_UNITS = {"H": "J/m²", "E": "W/m²", "Q": "J", "P": "W"}
KNOWN = {"read": "read", "memory": "from memory", "computed": "computed", "entered": "entered"}
#: What is looked at, and what meets bare skin: a beam, a lit spot, a sweep, a sweep that has stopped.
LOOKING = {
    "beam": ("Looking into the beam", "The beam on bare skin"),
    "spot": ("Looking at the lit spot", "The scattered light on bare skin"),
    "sweep": ("Looking into the sweeping beam", "The sweeping beam on bare skin"),
    "stopped": ("Looking into the beam when the sweep stops", "The beam on bare skin when the sweep stops"),
}
TIMES = ((1.0, "s", 1.0), (1e-3, "ms", 1e3), (1e-6, "µs", 1e6), (1e-9, "ns", 1e9), (1e-12, "ps", 1e12))


def exactly(value: float | None) -> str:
    """A number as the JSON answer gives it, for machine-readable attributes."""
    return "" if value is None else repr(value)


def scale(name: str, number: int) -> str:
    """A scale number as marked: LB6; none needed; beyond LB10."""
    top = 5 if name == "RB" else 10
    return "none" if number == 0 else f"beyond {name}{top}" if number > top else f"{name}{number}"


def scale_limit_text(row: ScaleRow) -> str:
    """What a filter of scale number n withstands and holds back, as printed: E = 1 x 10^(n + 1) W/m2."""
    sign = "+" if row.exponent_offset >= 0.0 else "-"
    power = f"10^(n {sign} {abs(row.exponent_offset):g})"
    return f"{row.quantity} = {row.coefficient:g} x {power} {QUANTITY_UNITS[row.quantity]}"


def working_value(step: WorkingStep) -> str:
    """The value of a step to six digits, to the safe side: limits and near ends down, the rest up."""
    if step.value is None:
        return ""
    down = step.symbol.startswith(("H_MPE", "AEL")) or step.symbol == "z_near"
    return shown_down(step.value, 6) if down else shown_up(step.value, 6)


def duration(seconds: float) -> str:
    """A duration in the unit people say it in."""
    for least, unit, factor in TIMES:
        if seconds >= least * (1 - 1e-12):
            return f"{plain(float(f'{seconds * factor:.10g}'))} {unit}"
    return f"{plain(float(f'{seconds * 1e15:.10g}'))} fs"


def governing(target: TargetAnswer) -> Criterion:
    """The criterion that governs."""
    return target.criteria[target.governing]


def governing_sum(target: TargetAnswer) -> SumOfLines | None:
    """The lines added that exceed every criterion of a single line, and so count; None otherwise."""
    largest = max(target.sums, key=lambda s: s.hazard_ratio, default=None)
    own = governing(target).hazard_ratio
    return largest if largest and len(largest.lines) > 1 and largest.hazard_ratio >= own else None


def headline(
    name: str, target: TargetAnswer, result: EvaluationResult, words: str, *, stopped: bool = False
) -> str:
    """One sentence for the eye, the skin or the eye behind optics (aided); `words` name the duration."""
    exposures = {d.exposure_s for d in result.durations}
    rule = governing(target).rule
    one = exposures.pop() if len(exposures) == 1 else None
    seconds = "" if one is None else f"{plain(one)} s" if one >= 0.1 else duration(one)
    time = f" for {words}, {seconds}" if seconds and words else f" for {seconds}" if seconds else ""
    if not seconds:
        time = " for the usual exposure of each line"
    if rule == "single":
        time = " for a pulse"
    elif rule == "train":
        time = f" for the pulse train{f' within {seconds}' if seconds else ''}"
    kind = "stopped" if stopped else "spot" if result.diffuse else "sweep" if result.scan else "beam"
    looking = LOOKING[kind][name == "skin"]
    if name == "aided":
        looking += " through the optics entered"
    if target.hazard_zone_m is None:
        return f"{looking} exceeds no limit at any distance{time}."
    near, far = target.hazard_zone_m
    if far is None:
        why = ": the beam does not spread" if kind in ("beam", "stopped") else ""
        return f"{looking} is unsafe at every distance{time}{why}."
    if near > 0.0:
        return f"{looking} is unsafe between {shown_down(near)} m and {shown_up(far)} m{time}."
    return f"{looking} is unsafe out to {shown_up(far)} m{time}."


def all_day(spot: DiffuseAnswer) -> str:
    """Whether one may look at a lit spot for a working day."""
    day = f"a working day, {plain(spot.day_s)} s"
    if spot.safe_all_day:
        return f"The lit spot may be looked at for {day}, from {plain(spot.nearest_m)} m on."
    if spot.day_hazard_distance_m is None:
        return f"Looking at the lit spot for {day}, is unsafe at every distance."
    return f"Looking at the lit spot for {day}, is unsafe out to {shown_up(spot.day_hazard_distance_m)} m."


def spoken(result: EvaluationResult, words: str) -> str:
    """The answer in a few words, for a line that is read out while somebody types."""
    found = [headline(name, target, result, words) for name, target in looks(result)]
    if result.scan is not None:
        stopped = [("eye", result.scan.failure_eye), ("aided", result.scan.failure_eye_aided)]
        found += [
            f"If it stops: {headline(name, target, result, words, stopped=True)}"
            for name, target in stopped
            if target is not None
        ]
    return f"{' '.join(found)} {class_sentence(result)}"


def looks(result: EvaluationResult) -> list[tuple[str, TargetAnswer]]:
    """Who is judged: the eye, the eye behind an optical aid where one was entered, the skin."""
    aided = [] if result.eye_aided is None else [("aided", result.eye_aided)]
    return [("eye", result.eye), *aided, ("skin", result.skin)]


def class_sentence(result: EvaluationResult) -> str:
    """The class under every scheme in one sentence."""
    return "; ".join(f"Class {c.hazard_class} after {c.title}" for c in result.classification) + "."


def eyewear_sentence(result: EvaluationResult) -> str:
    """What eyewear needs in one sentence, and whether something at hand will do."""
    needs, aided, added = [], False, False
    for k, line in enumerate(result.protection.lines):
        place, density = density_asked(result, k)
        if density > 0.0:
            needs.append(f"optical density {shown_up(density)} at {line.wavelength_nm:g} nm")
            aided, added = aided or place == "behind_aid", added or lines_together(result, k) > 1
    reasons = [
        *(["behind the optics entered"] if aided else []),
        *(["with room for the lines that add"] if added else []),
    ]
    why = f", {' and '.join(reasons)}" if reasons else ""
    needed = (
        f"Where the beam is worst it needs {' and '.join(needs)}{why}."
        if needs
        else "No line needs a filter."
    )
    pairs = result.protection.eyewear
    if not pairs:
        return needed
    enough = [p.name for p in sorted(pairs, key=lambda p: p.rank) if p.sufficient]
    at_hand = f"Sufficient at hand: {', '.join(enough)}." if enough else "No pair at hand will do."
    return f"{needed} {at_hand}"


def reason(target: TargetAnswer, result: EvaluationResult) -> str:
    """Why the distance is what it is: the criterion that governs, its limit, its aperture and the lead."""
    c, added = governing(target), governing_sum(target)
    line = f" of line {c.line + 1}" if len(result.durations) > 1 else ""
    counted = {
        "exposure": f"over {duration(c.duration_s)}",
        "single": f"for a pulse of {duration(c.duration_s)}",
        "average": f"for each pulse within {duration(c.duration_s)}",
        "train": f"for each pulse, C_P = {shown_down(c.pulse_factor or 1.0)}",
    }
    text = (
        f"{RULE_NAMES[c.rule].capitalize()}{line} governs ({c.tissue}, {c.effect}): "
        f"{shown_up(c.hazard_ratio)} times the limit of {shown_down(c.limit_j_m2)} J/m² "
        f"{counted[c.rule]}, averaged over {shown_down(c.aperture_mm)} mm"
    )
    if added:
        numbers = " + ".join(str(n + 1) for n in added.lines)
        reached = shown_up(added.hazard_ratio)
        return f"Lines {numbers} added reach {reached} times the limit. Largest share: {text}."
    others = [o.hazard_ratio for k, o in enumerate(target.criteria) if k != target.governing]
    if others and max(others) > 0.0:
        alike = max(others) >= c.hazard_ratio * (1.0 - 1e-9)
        reached = "as much" if alike else f"{shown_up(max(others))} times its limit"
        return f"{text}; the next criterion reaches {reached}."
    return f"{text}."


def element(entry: dict[str, Any]) -> str:
    """An element of the bench as it was understood, in words: Lens, focal length 50 mm."""
    name, fields_ = ELEMENTS[entry["element"]]
    words = [name]
    for field in fields_:
        value = entry.get(field.removeprefix("bench_"))
        spec = FIELDS[field]
        if value is None:
            continue
        shown = dict(spec.choices).get(str(value), str(value))
        if spec.number:
            shown = (
                f"{typeset(value)} {base_unit(spec.family).shown if spec.family != 'share' else ''}".rstrip()
            )
        words.append(f"{spec.label.removeprefix('or ').lower()} {shown}")
    return ", ".join(words)


def viewing(entry: dict[str, Any]) -> str:
    """Who looks through what, in words; blank for the naked eye in clear air."""
    aid, haze = entry.get("aid"), entry.get("visibility_km")
    words = ["The beam goes outdoors."] if entry.get("outdoors") else []
    if aid:
        words.append(
            f"Looked at through optics of magnification {plain(aid['magnification'])}, objective "
            f"{plain(aid['objective_mm'])} mm, transmittance {plain(aid['transmittance'])}."
        )
    if haze is not None:
        words.append(f"Visibility {plain(haze)} km.")
    return " ".join(words)


def sources(result: EvaluationResult) -> list[tuple[str, list[str]]]:
    """Every document and place that an answer names, and how its values are known."""
    steps = [*result.working]
    for scheme in result.classification:
        steps += scheme.working
    for line in result.protection.lines:
        steps += line.worst_place.working
    named = [
        (c.source, c.known) for t in (result.eye, result.skin, result.eye_aided) if t for c in t.criteria
    ]
    named += [(d.source, d.known) for d in result.durations]
    named += [(s.source, s.known) for s in steps]
    found: dict[str, dict[str, None]] = {}
    for source, known in named:
        if source:
            found.setdefault(source, {})[known] = None
    return [(text, [k for k in KNOWN if k in known]) for text, known in sorted(found.items())]


def limit_text(row: LimitRow) -> str:
    """A limit row as printed: H = 18 t^0.75 C_E."""
    expression = limit_expression(row.coefficient, row.time_power, row.factors, "t")
    cap = f", at most {row.cap:g}" if row.cap is not None else ""
    return f"{row.quantity} = {expression}{cap} {QUANTITY_UNITS[row.quantity]}"


def factor_text(row: FactorRow) -> str:
    """A piece of a factor as printed."""
    names = {"wavelength_nm": "λ", "time_s": "t", "subtense_mrad": "α"}
    return row.expression(names[row.variable])


def factor_band(row: FactorRow) -> str:
    """The band of a piece of a factor."""
    unit = {"wavelength_nm": "nm", "time_s": "s", "subtense_mrad": "mrad"}[row.variable]
    return band(row.from_, row.to, unit)


def band(low: float | str | None, high: float | str | None, unit: str) -> str:
    """A band in words; blank ends are open."""

    def end(value: float | str) -> str:
        return value if isinstance(value, str) else f"{value:g}"

    if low is None and high is None:
        return "all"
    if low is None:
        return f"up to {end(high or 0.0)} {unit}"
    if high is None:
        return f"above {end(low)} {unit}"
    return f"{end(low)} to {end(high)} {unit}"


def repetition_text(row: RepetitionRow) -> str:
    """A row of the repetitive-pulse factor as printed."""
    floor = f", at least {row.floor:g}" if row.floor else ""
    return limit_expression(row.coefficient, row.count_power, "", "N") + floor


def documents(rules: LimitSet) -> list[str]:
    """Keys of the documents that the rows of a set name, in the order of sources.toml."""
    tables = [getattr(rules, f.name) for f in fields(rules)]
    rows = [row for table in tables if isinstance(table, tuple) for row in table if isinstance(row, Row)]
    named = {rules.document} | {row.source for row in rows}
    return [key for key in rules.sources if key in named]


def targets_of(rules: LimitSet) -> list[str]:
    """What the limits are for (eye and skin, or classes), in printed order."""
    return list(dict.fromkeys(row.target for row in rules.limits))


def rows_of(rules: LimitSet, target: str) -> list[LimitRow]:
    """Limit rows of one target, in printed order."""
    return [row for row in rules.limits if row.target == target]
